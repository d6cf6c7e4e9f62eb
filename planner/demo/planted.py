"""The complications planted in the demo, each a fact that the program must find."""

from __future__ import annotations

from planner.demo.type_tables import Row

Tables = dict[str, list[Row]]


def plant(tables: Tables) -> None:
    """Plant them all, in place; what a small fleet has no room for is left out."""
    _future_aircraft_changes(tables)
    _rating_that_expires(tables)
    _leased_in_spare(tables)
    _other_owner(tables)
    _directive(tables)


def _future_aircraft_changes(tables: Tables) -> None:
    """One aircraft leaves WB in 2030."""
    leaving = [row for row in tables["aircraft"] if row["sub_fleet"] == "WB" and not row["owner"]]
    if leaving:
        leaving[-1]["exit_date"] = "2030-06-30"


def _rating_that_expires(tables: Tables) -> None:
    """A bought rating ends on 2027-06-30."""
    high = [row for row in tables["aircraft"] if row["sub_fleet"] == "NA" and row["rating"] == "high"]
    if high:
        high[-1] |= {"rating_until": "2027-06-30", "rating_after": "mid"}


def _leased_in_spare(tables: Tables) -> None:
    """One spare of type N is leased in and due back on 2026-12-31."""
    spares = [row for row in tables["engines"] if row["engine_type"] == "N" and row["place"] == "spare"]
    if len(spares) > 1:
        serial = spares[-1]["engine_serial"]
        spares[-1] |= {"place": "leased_in", "lease_in_until": "2026-12-31", "owner": "Evergate Pool"}
        inside = {m["module_serial"] for m in tables["modules"] if m.get("engine_serial") == serial}
        for row in tables["modules"]:
            if row["module_serial"] in inside:
                row["owner"] = "Evergate Pool"
        for row in tables["parts"]:
            if row["module_serial"] in inside:
                row["owner"] = "Evergate Pool"


def _other_owner(tables: Tables) -> None:
    """The LPT of one leased engine flies on an engine of the airline, and the airline's LPT on the leased one."""
    by_engine = {row["engine_serial"]: row for row in tables["engines"]}
    lpts = [m for m in tables["modules"] if m["module"] == "LPT" and m["engine_type"] == "N" and m.get("engine_serial")]
    flying = [m for m in lpts if by_engine[m["engine_serial"]]["place"] == "wing"]
    theirs = next((m for m in flying if m["owner"]), None)
    if theirs is None:
        return
    ours = next((m for m in flying if not m["owner"]), None)
    if ours is not None:
        # only the title moves in the records: whose serial it is; where it flies stays as the history says
        theirs_owner = theirs["owner"]
        ours["owner"], theirs["owner"] = theirs_owner, ""
        for part in tables["parts"]:
            if part["module_serial"] == ours["module_serial"]:
                part["owner"] = theirs_owner
            elif part["module_serial"] == theirs["module_serial"]:
                part["owner"] = ""


def _directive(tables: Tables) -> None:
    """From 2026-11-15 six HPT disks of type N have less life, two of them over the new limit on the first day."""
    disks = [p for p in tables["parts"] if p["part_number"] == "NHT-01"]
    if len(disks) < 6:
        return
    disks.sort(key=lambda p: p["part_serial"])
    best, start = -1, 0
    for number in range(len(disks) - 5):
        over = sum(p["cycles_since_new"] > 10_500 for p in disks[number : number + 6])
        score = -abs(over - 2)
        if score > best or best == -1:
            best, start = score, number
    hit = disks[start : start + 6]
    numbers = [int(p["part_serial"].rpartition("-")[2]) for p in hit]
    for rating, limit in (("low", 14_000), ("mid", 11_800), ("high", 8_300)):
        tables["part_limits"].append(
            {
                "part_number": "NHT-01",
                "rating": rating,
                "limit_cycles": limit,
                "valid_from": "2026-11-15",
                "serial_prefix": "NHT01-",
                "serial_from": numbers[0],
                "serial_to": numbers[-1],
                "directive": "Directive 2026-17",
                "source": "airworthiness directive 2026-17",
            }
        )
