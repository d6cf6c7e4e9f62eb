"""The demo's tables as a book that can be looked up and written into without breaking what adds up."""

from __future__ import annotations

import datetime as dt
import math
from fractions import Fraction

from planner.demo.scenario_tables import SEASON
from planner.demo.sub_fleets import AS_OF
from planner.demo.type_tables import Row
from sim.season import Season

_FLIGHT_HOURS = {"N": 1.7, "W": 5.0}
_CYCLES_A_DAY = {"N": 4.5, "W": 2.0}


class Book:
    """Rows by their serials. Everything is read from the tables as they are now."""

    def __init__(self, tables: dict[str, list[Row]]) -> None:
        self.tables = tables
        self.engines = {row["engine_serial"]: row for row in tables["engines"]}
        self.tails = {row["tail"]: row for row in tables["aircraft"]}
        self.leases = {row["tail"]: row for row in tables["leases"]}
        self.on_tail: dict[str, list[Row]] = {}
        for row in tables["engines"]:
            if row["place"] == "wing":
                self.on_tail.setdefault(row["tail"], []).append(row)
        self.modules: dict[str, list[Row]] = {}
        for row in tables["modules"]:
            self.modules.setdefault(row.get("engine_serial", ""), []).append(row)
        self.parts: dict[str, list[Row]] = {}
        for row in tables["parts"]:
            self.parts.setdefault(row["module_serial"], []).append(row)
        self.stretches: dict[str, list[Row]] = {}
        for row in tables["part_history"]:
            self.stretches.setdefault(row["part_serial"], []).append(row)
        self.new_margin = {(r["engine_type"], r["rating"]): float(r["new_margin_degC"]) for r in tables["ratings"]}
        self._limits = {
            (row["part_number"], row["rating"]): int(row["limit_cycles"])
            for row in tables["part_limits"]
            if not row.get("directive")
        }
        self._season = Season(AS_OF, SEASON)

    def parts_of(self, engine: Row) -> list[Row]:
        return [part for module in self.modules[engine["engine_serial"]] for part in self.parts_in(module)]

    def parts_in(self, module: Row) -> list[Row]:
        return self.parts.get(module["module_serial"], [])

    def rating_of(self, engine: Row) -> str:
        """Return the rating at which an engine on a wing flies."""
        return str(self.tails[engine["tail"]]["rating"])

    def left(self, part: Row, rating: str, limits: dict[str, int] | None = None) -> int:
        """Return cycles left at a rating, rounded down, negative once passed; ``limits`` replaces those in force."""
        number, used = part["part_number"], Fraction(0)

        def limit(at: str) -> int:
            return self._limits[number, at] if limits is None else limits[at]

        for row in self.stretches.get(part["part_serial"], []):
            used += Fraction(int(row["cycles"]), limit(row["rating"]))
        return math.floor((1 - used) * limit(rating))

    def least_left(self, engine: Row) -> int:
        rating = self.rating_of(engine)
        return min(self.left(part, rating) for part in self.parts_of(engine))

    def margin(self, engine: Row) -> float:
        """Return the hot-day margin of an engine on a wing, from its modules, without wash."""
        lost = sum(float(m["margin_lost_degC"]) for m in self.modules[engine["engine_serial"]])
        return self.new_margin[engine["engine_type"], self.rating_of(engine)] - lost

    def flown_by(self, tail: str, date: dt.date) -> int:
        """Return the cycles that a tail is planned to fly from today to a date."""
        years = self._season.flown(float((date - AS_OF).days))
        return math.ceil(years * float(self.tails[tail]["cycles_per_year"]))

    def age(self, part: Row, *, rating: str, left: int) -> None:
        """Give a part a life with an operator before, so that so many cycles are left at a rating."""
        cycles = self.left(part, rating) - left
        if cycles <= 0:
            raise ValueError(f"{part['part_serial']} has no {left} cycles to be left with")
        kind = part["part_number"][0]
        known = self.stretches.setdefault(part["part_serial"], [])
        begun = min((dt.date.fromisoformat(row["from_date"]) for row in known), default=AS_OF)
        last = begun - dt.timedelta(days=90)
        first = last - dt.timedelta(days=round(cycles / _CYCLES_A_DAY[kind]) + 30)
        row: Row = {
            "part_serial": part["part_serial"],
            "rating": rating,
            "from_date": first.isoformat(),
            "to_date": last.isoformat(),
            "cycles": cycles,
            "hours": round(cycles * _FLIGHT_HOURS[kind], 2),
            "source": "records of the operator before",
        }
        known.append(row)
        self.tables["part_history"].append(row)
        part["cycles_since_new"] = int(part["cycles_since_new"]) + cycles
        part["hours_since_new"] = round(float(part["hours_since_new"]) + row["hours"], 2)

    def renew(self, part: Row, *, serial: str) -> None:
        """Put a new part of another serial in the place of one, whose history leaves with it."""
        gone = self.stretches.pop(part["part_serial"], [])
        self.tables["part_history"] = [row for row in self.tables["part_history"] if row not in gone]
        part |= {"part_serial": serial, "cycles_since_new": 0, "hours_since_new": 0}

    def set_margin(self, engine: Row, wanted_degC: float) -> None:
        """Move an engine's margin: its HPT has lost more or less, and its readings since the last visit say so."""
        move = self.margin(engine) - wanted_degC
        serial = engine["engine_serial"]
        hpt = next(m for m in self.modules[serial] if m["module"] == "HPT")
        hpt["margin_lost_degC"] = round(float(hpt["margin_lost_degC"]) + move, 3)
        readings = [row for row in self.tables["margins"] if row["engine_serial"] == serial]
        readings.sort(key=lambda row: str(row["date"]))
        for row in reversed(readings):
            row["margin_degC"] = round(float(row["margin_degC"]) - move, 1)
            if row["event"] == "visit":
                break
