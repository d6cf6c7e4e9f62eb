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
    _weak_etops_pair(tables)
    _little_left_on_a_leased_tail(tables)


def smooth(tables: Tables) -> None:
    """Make a plain fleet plain: one standard of each module, and no tail with two weak engines."""
    tables.pop("standards", None)
    for row in tables["modules"]:
        row["standard"] = ""
    weak: dict[str, int] = {}
    for engine in tables["engines"]:
        if engine["place"] == "wing" and margin(tables, engine["engine_serial"]) < _WEAK_MARGIN + 4:
            weak[engine["tail"]] = weak.get(engine["tail"], 0) + 1
            set_margin(tables, engine["engine_serial"], _WEAK_MARGIN + 10.0)


_WEAK_MARGIN = 12.0  # the setting's default, below which an engine counts as weak


def _rating(tables: Tables, engine: Row) -> str:
    return next(str(a["rating"]) for a in tables["aircraft"] if a["tail"] == engine["tail"])


def margin(tables: Tables, serial: str) -> float:
    """Return the hot-day margin of an engine on the wing, from its modules."""
    engine = next(e for e in tables["engines"] if e["engine_serial"] == serial)
    rating = _rating(tables, engine)
    new = next(
        float(r["new_margin_degC"])
        for r in tables["ratings"]
        if r["engine_type"] == engine["engine_type"] and r["rating"] == rating
    )
    return new - sum(float(m["margin_lost_degC"]) for m in tables["modules"] if m.get("engine_serial") == serial)


def set_margin(tables: Tables, serial: str, wanted_degC: float) -> None:
    """Move an engine's margin to a value: its HPT has lost more (or less), and its readings say so."""
    move = margin(tables, serial) - wanted_degC
    for module in tables["modules"]:
        if module.get("engine_serial") == serial and module["module"] == "HPT":
            module["margin_lost_degC"] = round(float(module["margin_lost_degC"]) + move, 3)
    for reading in tables["margins"]:
        if reading["engine_serial"] == serial:
            reading["margin_degC"] = round(float(reading["margin_degC"]) - move, 1)


def _weak_etops_pair(tables: Tables) -> None:
    """An ETOPS tail with two weak engines: a plan by margin alone would send both away together."""
    tails = [row["tail"] for row in tables["aircraft"] if row.get("etops_minutes") and row["sub_fleet"] == "NC"]
    if not tails:
        return
    for number, engine in enumerate(e for e in tables["engines"] if e.get("tail") == tails[-1]):
        set_margin(tables, engine["engine_serial"], 8.5 + 0.4 * number)


def _little_left_on_a_leased_tail(tables: Tables) -> None:
    """An engine with 120 cycles left on one part and little margin on a leased tail: the part was bought used, and its
    life with the operator before stands in its history."""
    leased = {row["tail"] for row in tables["leases"]}
    changed = {row["tail"] for row in tables["rating_changes"]}
    engines = [e for e in tables["engines"] if e.get("tail") in leased - changed and e["engine_type"] == "N"]
    for engine in engines:
        serial = engine["engine_serial"]
        rating = _rating(tables, engine)
        hpt = next(
            m["module_serial"] for m in tables["modules"] if m.get("engine_serial") == serial and m["module"] == "HPT"
        )
        part = next(p for p in tables["parts"] if p["module_serial"] == hpt and p["part_number"] == "NHT-02")
        stretches = [h for h in tables["part_history"] if h["part_serial"] == part["part_serial"]]
        if not stretches or {h["rating"] for h in stretches} != {rating}:
            continue
        limit = next(
            int(x["limit_cycles"])
            for x in tables["part_limits"]
            if x["part_number"] == "NHT-02" and x["rating"] == rating
        )
        more = limit - 120 - int(part["cycles_since_new"])
        first = min(str(h["from_date"]) for h in stretches)
        hours = round(more * 1.6, 2)
        tables["part_history"].append(
            {
                "part_serial": part["part_serial"],
                "rating": rating,
                "from_date": f"{int(first[:4]) - 8}{first[4:]}",
                "to_date": first,
                "cycles": more,
                "hours": hours,
                "source": "record of the operator before",
            }
        )
        part["cycles_since_new"] = limit - 120
        part["hours_since_new"] = round(float(part["hours_since_new"]) + hours, 2)
        set_margin(tables, serial, 8.0)
        return


def _future_aircraft_changes(tables: Tables) -> None:
    """One aircraft leaves WB in 2030."""
    leaving = [row for row in tables["aircraft"] if row["sub_fleet"] == "WB" and not row["owner"]]
    if leaving:
        leaving[-1]["exit_date"] = "2030-06-30"


def _rating_that_expires(tables: Tables) -> None:
    """A bought rating ends on 2027-06-30."""
    flying = [row for row in tables["aircraft"] if not row.get("entry_date")]
    high = [row for row in flying if row["sub_fleet"] == "NA" and row["rating"] == "high"]
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
