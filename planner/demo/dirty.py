"""The dirty twin: a few aircraft whose records hold every fault of the list, each once, and where it stands."""

from __future__ import annotations

from pathlib import Path
from typing import NamedTuple

from planner.demo.type_tables import Row
from planner.demo.write import write_tables

Tables = dict[str, list[Row]]


class Fault(NamedTuple):
    """One fault: the file and column it stands in (row as a spreadsheet shows it, or None), and what it is."""

    file: str
    row: int | None
    column: str
    what: str


def dirty_tables(folder: Path, clean: Tables) -> None:
    """Write the dirty folder."""
    tables, _ = soil(clean)
    write_tables(folder, tables)
    _by_hand(folder)


def soil(clean: Tables) -> tuple[Tables, list[Fault]]:
    """Return a small copy with the faults that a table can hold, and the list of them."""
    tables = _small(clean)
    faults: list[Fault] = []
    parts, engines, history, types = tables["parts"], tables["engines"], tables["part_history"], tables["part_types"]

    def fault(table: str, number: int, column: str, value: object, what: str) -> None:
        tables[table][number][column] = value
        faults.append(Fault(f"{table}.csv", number + 2, column, what))

    fault("parts", 3, "cycles_since_new", -120, "cycles that run backwards")
    letter = engines[1]["engine_serial"].replace("0", "O", 1)
    fault("modules", 7, "engine_serial", letter, "a serial with the letter O for a zero")
    fault("installs", 0, "on_date", "", "a missing installation date")
    parts.append(dict(parts[5]) | {"module_serial": parts[12]["module_serial"]})
    faults.append(Fault("parts.csv", len(parts) + 1, "part_serial", "one part in two modules"))
    on_wing = [number for number, row in enumerate(engines) if row["place"] == "wing"]
    engines[on_wing[1]] |= {"tail": engines[on_wing[0]]["tail"], "position": engines[on_wing[0]]["position"]}
    faults.append(Fault("engines.csv", on_wing[1] + 2, "position", "two engines in one position"))
    tables["rating_changes"] = [{"tail": tables["aircraft"][0]["tail"], "from_date": "", "rating": "high"}]
    faults.append(Fault("rating_changes.csv", 2, "from_date", "a missing rating-change date"))
    history[0]["cycles"] = max(0, int(history[0]["cycles"]) - 700)
    faults.append(Fault("part_history.csv", 2, "cycles", "a gap in a part's trace"))
    fault("part_types", 0, "price_usd", "EUR 290000", "a price in another currency")
    fault("part_types", 1, "price_usd", "", "a blank price")
    for number, row in enumerate(tables["aircraft"]):
        if row["sub_fleet"] == "NA":
            row["hours_since_new"] = round(float(row["hours_since_new"]) * 1.18, 2)
            faults.append(Fault("aircraft.csv", number + 2, "hours_since_new", "hours of block time"))
    limits = tables["part_limits"]
    disk = [n for n, row in enumerate(limits) if row["part_number"] == "NHT-01" and not row.get("directive")]
    limits[disk[0]]["limit_cycles"], limits[disk[2]]["limit_cycles"] = (
        limits[disk[2]]["limit_cycles"],
        limits[disk[0]]["limit_cycles"],
    )
    faults.append(Fault("part_limits.csv", disk[0] + 2, "limit_cycles", "a limit in the rating column of another"))
    history[2]["from_date"], history[2]["to_date"] = history[2]["to_date"], history[2]["from_date"]
    faults.append(Fault("part_history.csv", 4, "from_date", "a date in the wrong order"))
    fault("bases", 1, "environment", "1,45", "a comma as the decimal sign")
    fault("part_types", 4, "name", "=1+1", "a formula in a text cell")
    del types
    return tables, faults


def _small(clean: Tables) -> Tables:
    """Keep the first two tails of NA and one of NC with what belongs to them."""
    na = [row["tail"] for row in clean["aircraft"] if row["sub_fleet"] == "NA"][:2]
    other = [row["tail"] for row in clean["aircraft"] if row["engine_type"] == "N" and row["tail"] not in na][-1:]
    tails = set(na + other) or {clean["aircraft"][0]["tail"]}
    kinds = {row["engine_type"] for row in clean["aircraft"] if row["tail"] in tails}
    engines = {row["engine_serial"] for row in clean["engines"] if row.get("tail") in tails}
    modules = {row["module_serial"] for row in clean["modules"] if row.get("engine_serial") in engines}
    parts = {row["part_serial"] for row in clean["parts"] if row["module_serial"] in modules}
    keep = {
        "aircraft": lambda r: r["tail"] in tails,
        "engines": lambda r: r["engine_serial"] in engines,
        "modules": lambda r: r["module_serial"] in modules,
        "parts": lambda r: r["part_serial"] in parts,
        "part_history": lambda r: r["part_serial"] in parts,
        "installs": lambda r: r["serial"] in engines and not r["off_date"],
        "margins": lambda r: r["engine_serial"] in engines,
    }
    left_out = ("leases", "lease_terms", "lease_settlements", "lease_delivery", "reserve_accounts", "removals")
    tables: Tables = {}
    for name, rows in clean.items():
        if name in left_out:
            continue
        kept = [dict(r) for r in rows if r.get("engine_type") in kinds or "engine_type" not in r]
        tables[name] = [r for r in kept if keep[name](r)] if name in keep else kept
    numbers = {r["part_number"] for r in tables["part_types"]}
    tables["part_limits"] = [r for r in tables["part_limits"] if r["part_number"] in numbers]
    return tables


def _by_hand(folder: Path) -> None:
    """Faults that no table writer makes: a heading with a trailing space, and rows of pure noise."""
    path = folder / "modules.csv"
    text = path.read_text(encoding="utf-8")
    heading, _, rest = text.partition("\n")
    path.write_text(heading.replace("owner", "owner ", 1) + "\n" + rest, encoding="utf-8")
    with (folder / "margins.csv").open("a", encoding="utf-8") as file:
        file.write("@@##,,??,not a number,\u00a4\u00a4\nx;y;z\n")
