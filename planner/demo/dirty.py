"""The dirty twin: three aircraft whose records hold every fault that a planner meets, and where each one stands."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

from planner.demo.type_tables import Row
from planner.demo.write import write_tables

Tables = dict[str, list[Row]]
NOISE = "@@##,,??,not a number,\u00a4\u00a4,0x1F,;;\nx;y;z\n"
_BLOCK_TIME_FACTOR = 1.12
_LEFT_OUT = (
    "leases",
    "lease_terms",
    "lease_settlements",
    "lease_delivery",
    "reserve_accounts",
    "removals",
    "watch",
    "slots",
)


class Fault(NamedTuple):
    """One fault: what it is, the file, row (as a spreadsheet shows it, 1 is the headings) and column that it stands
    in, and the check that has to tell it."""

    what: str
    file: str
    row: int
    column: str
    rule: str


def write_dirty(folder: Path, clean: Tables) -> None:
    """Write the dirty form of a clean fleet; noise and a heading with a space are put in by hand, no table writer
    makes them."""
    tables, _ = soil(clean)
    write_tables(folder, tables)
    path = folder / "modules.csv"
    heading, _, rest = path.read_text(encoding="utf-8").partition("\n")
    path.write_text(heading.replace("owner", "owner ", 1) + "\n" + rest, encoding="utf-8")
    with (folder / "margins.csv").open("a", encoding="utf-8") as file:
        file.write(NOISE)


def soil(clean: Tables) -> tuple[Tables, list[Fault]]:
    """Return three aircraft with all the faults, and the list of them. Each fault has rows of its own."""
    tables = _small(clean)
    faults: list[Fault] = []
    for dirt in _DIRT:
        faults += dirt(tables)
    faults.append(Fault("a heading with a trailing space", "modules.csv", 1, "owner", "headings_have_no_stray_spaces"))
    last = len(tables["margins"]) + 1
    for number in (1, 2):
        faults.append(Fault("noise", "margins.csv", last + number, "", "rows_are_as_wide_as_the_headings"))
    return tables, faults


def _spoil(tables: Tables, table: str, number: int, column: str, value: object, *, what: str, rule: str) -> list[Fault]:
    tables[table][number][column] = value
    return [Fault(what, f"{table}.csv", number + 2, column, rule)]


def _counters_run_backwards(tables: Tables) -> list[Fault]:
    """An engine goes back on a wing with fewer cycles than at its installation before."""
    links = tables["installs"]
    earlier = {row["serial"]: row for row in links if row["off_date"]}
    number = next(n for n, row in enumerate(links) if not row["off_date"] and row["serial"] in earlier)
    fewer = max(0, int(earlier[links[number]["serial"]]["cycles_on"]) - 250)
    earlier[links[number]["serial"]]["cycles_on"] = fewer + 250
    rule = "installation_counters_do_not_run_backwards"
    return _spoil(tables, "installs", number, "cycles_on", fewer, what="cycles that run backwards", rule=rule)


def _letter_for_a_zero(tables: Tables) -> list[Fault]:
    serial = tables["engines"][-1]["engine_serial"]
    number = next(n for n, row in enumerate(tables["modules"]) if row["engine_serial"] == serial)
    what = "a serial with the letter O for a zero"
    return _spoil(
        tables, "modules", number, "engine_serial", serial.replace("0", "O", 1), what=what, rule="references_exist"
    )


def _missing_dates(tables: Tables) -> list[Fault]:
    found = _spoil(
        tables, "installs", 0, "on_date", "", what="a missing installation date", rule="installations_are_dated"
    )
    tables["rating_changes"] = [{"tail": tables["aircraft"][-1]["tail"], "from_date": "", "rating": "mid"}]
    return [
        *found,
        Fault("a missing rating-change date", "rating_changes.csv", 2, "from_date", "rating_changes_are_dated"),
    ]


def _two_places(tables: Tables) -> list[Fault]:
    parts, engines = tables["parts"], tables["engines"]
    other = next(row for row in reversed(parts) if row["part_number"] == parts[0]["part_number"])
    parts.append(parts[0] | {"module_serial": other["module_serial"]})
    found = [Fault("one part in two modules", "parts.csv", len(parts) + 1, "module_serial", "parts_are_in_one_place")]
    engines[1] |= {"tail": engines[0]["tail"], "position": engines[0]["position"]}
    rule = "engine_positions_hold_one_engine"
    return [*found, Fault("two engines in one position", "engines.csv", 3, "position", rule)]


def _gap_in_a_trace(tables: Tables) -> list[Fault]:
    """The first of a part's stretches ends early: days and cycles up to the second are told nowhere."""
    history = tables["part_history"]
    by_part: dict[str, list[int]] = {}
    for number, row in enumerate(history):
        by_part.setdefault(row["part_serial"], []).append(number)
    first, second = next(numbers for numbers in reversed(by_part.values()) if len(numbers) > 1)[:2]
    row = history[first]
    begun, over = (dt.date.fromisoformat(row[day]) for day in ("from_date", "to_date"))
    row["cycles"] -= row["cycles"] // 5
    row["to_date"] = (over - (over - begun) / 5).isoformat()
    what = "a gap in a part's trace"
    return [Fault(what, "part_history.csv", second + 2, "from_date", "history_has_no_unexplained_gap")]


def _dates_in_the_wrong_order(tables: Tables) -> list[Fault]:
    row = tables["part_history"][0]
    row["from_date"], row["to_date"] = row["to_date"], row["from_date"]
    return [Fault("dates in the wrong order", "part_history.csv", 2, "to_date", "dates_are_in_order")]


def _prices(tables: Tables) -> list[Fault]:
    return [
        *_spoil(
            tables,
            "part_types",
            0,
            "price_usd",
            "EUR 290000",
            what="a price in another currency",
            rule="prices_are_in_one_currency",
        ),
        *_spoil(tables, "part_types", 1, "price_usd", "", what="a blank price", rule="prices_are_given"),
    ]


def _block_time(tables: Tables) -> list[Fault]:
    found = []
    for number, row in enumerate(tables["aircraft"]):
        if row["sub_fleet"] == tables["aircraft"][0]["sub_fleet"]:
            hours = round(float(row["hours_since_new"]) * _BLOCK_TIME_FACTOR, 2)
            rule = "hours_of_aircraft_are_flight_hours_as_of_their_parts"
            what = "hours of block time"
            found += _spoil(tables, "aircraft", number, "hours_since_new", hours, what=what, rule=rule)
    return found


def _limit_in_another_column(tables: Tables) -> list[Fault]:
    limits = tables["part_limits"]
    number = next(n for n, row in enumerate(limits) if row["part_number"] == "NHT-01")
    low, high = limits[number], limits[number + 2]
    low["limit_cycles"], high["limit_cycles"] = high["limit_cycles"], low["limit_cycles"]
    rule = "limits_do_not_rise_with_thrust"
    return [Fault("a limit in the rating column of another", "part_limits.csv", number + 4, "limit_cycles", rule)]


def _cells(tables: Tables) -> list[Fault]:
    return [
        *_spoil(
            tables,
            "bases",
            1,
            "environment",
            "1,45",
            what="a comma as the decimal sign",
            rule="numbers_use_a_decimal_point",
        ),
        *_spoil(
            tables, "part_types", 4, "name", "=1+1", what="a formula in a text cell", rule="cells_hold_no_formulas"
        ),
    ]


_DIRT: tuple[Callable[[Tables], list[Fault]], ...] = (
    _counters_run_backwards,
    _letter_for_a_zero,
    _missing_dates,
    _two_places,
    _gap_in_a_trace,
    _dates_in_the_wrong_order,
    _prices,
    _block_time,
    _limit_in_another_column,
    _cells,
)


def _small(clean: Tables) -> Tables:
    """Keep two tails of the first sub-fleet and the last of the same type, with what belongs to them."""
    first = clean["aircraft"][0]
    flying = [row for row in clean["aircraft"] if row["engine_type"] == first["engine_type"] and not row["entry_date"]]
    chosen = [row for row in flying if row["sub_fleet"] == first["sub_fleet"]][:2]
    chosen += [row for row in flying if row not in chosen][-1:]
    tails = {row["tail"] for row in chosen}
    engines = {row["engine_serial"] for row in clean["engines"] if row.get("tail") in tails}
    modules = {row["module_serial"] for row in clean["modules"] if row.get("engine_serial") in engines}
    parts = {row["part_serial"] for row in clean["parts"] if row["module_serial"] in modules}
    numbers = {row["part_number"] for row in clean["part_types"] if row["engine_type"] == first["engine_type"]}
    keep: dict[str, Callable[[Row], bool]] = {
        "aircraft": lambda r: r["tail"] in tails,
        "engines": lambda r: r["engine_serial"] in engines,
        "modules": lambda r: r["module_serial"] in modules,
        "parts": lambda r: r["part_serial"] in parts,
        "part_history": lambda r: r["part_serial"] in parts,
        "part_limits": lambda r: r["part_number"] in numbers and not r.get("directive"),
        "installs": lambda r: r["serial"] in engines,
        "margins": lambda r: r["engine_serial"] in engines,
    }
    tables: Tables = {}
    for name, rows in clean.items():
        if name not in _LEFT_OUT:
            kept = [dict(r) for r in rows if r.get("engine_type", first["engine_type"]) == first["engine_type"]]
            tables[name] = [r for r in kept if name not in keep or keep[name](r)]
    tables["engines"].sort(key=lambda r: (r["tail"], r["position"]))
    return tables
