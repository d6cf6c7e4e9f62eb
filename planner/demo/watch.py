"""Findings that limit how long a module may fly: one HPT and one combustor, seen by borescope in June 2026."""

from __future__ import annotations

from planner.demo.type_tables import Row

_FINDINGS = (
    ("HPT", "coating loss on nozzle vanes", "2026-06-09", {"inspect_every_cycles": 300, "remove_by_cycles": 1800}),
    ("combustor", "crack in the liner within limits", "2026-06-17", {"remove_by_date": "2027-10-31"}),
)


def watch_rows(tables: dict[str, list[Row]]) -> list[Row]:
    """Return the findings, on the modules on a wing that have flown longest since their restoration."""
    wing = {row["engine_serial"] for row in tables["engines"] if row["place"] == "wing" and row["engine_type"] == "N"}
    rows: list[Row] = []
    taken: set[str] = set()
    for module, finding, day, until in _FINDINGS:
        flying = [m for m in tables["modules"] if m["module"] == module and m.get("engine_serial") in wing - taken]
        if not flying:
            continue
        worn = max(flying, key=lambda m: (m["cycles_since_restoration"], m["module_serial"]))
        taken.add(worn["engine_serial"])
        rows.append({"serial": worn["module_serial"], "module": module, "finding": finding, "found_date": day} | until)
    return rows
