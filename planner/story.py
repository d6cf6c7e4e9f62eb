"""One serial's story: the dated history of an engine, module, part or tail in one run, for checking by eye."""

from __future__ import annotations

import datetime as dt

from planner.job import Scenario, prepare, run_log
from sim.errors import RequestError
from sim.events import KINDS

_SILENT = {"value"}
_WORDS = {
    "install": "installed on {other}, position {detail}",
    "removal": "removed from {other}: {detail}, after {cycles:,} cycles and {hours:,.0f} h on the wing",
    "flown": "flew {cycles:,} cycles and {hours:,.0f} h on {other} at rating {detail}",
    "induction": "inducted at {other}: {detail} visit",
    "release": "released by {other} after the {detail} visit",
    "module_off": "came off {other} ({detail}) with {cycles:,} cycles since restoration",
    "module_on": "built into {other} with {cycles:,} cycles since restoration",
    "module_induction": "inducted at {other} for repair",
    "module_release": "released by {other}",
    "part_off": "taken out of {other} after {cycles:,} cycles, {detail} cycles thrown away",
    "part_on": "new in {other} ({detail})",
    "work": "{detail} done at {cycles:,} cycles since new",
    "down": "on the ground: {detail}",
    "shortage": "wait for an engine: {detail}",
    "lease_sought": "lease-in sought: {detail}",
    "lease_start": "leased in for {other}",
    "lease_end": "lease-in ended {detail}",
    "keeping": "on the shelf",
    "wash": "washed {amount:g} times",
    "rating_change": "rating {detail} from here on",
    "return": "lease return",
    "entry": "enters the fleet",
    "exit": "leaves the fleet",
    "pool": "ready on the shelf",
    "decision": "decided: {detail}",
}


def story(scenario: Scenario, strategy: str, serial: str, *, run: int = 0) -> list[tuple[dt.date, dt.date, str]]:
    """Return (from, to, sentence) of everything that befell a serial in one run, in order of time.

    Raises RequestError when the fleet has no such serial.
    """
    fleet = scenario.fleet
    known = {
        *(e.engine_serial for e in fleet.engines),
        *(m.module_serial for m in fleet.modules),
        *(p.part_serial for p in fleet.parts),
        *(a.tail for a in fleet.aircraft),
    }
    log = run_log(scenario, strategy, run)
    rows = [r for r in log.rows if KINDS[r[0]] not in _SILENT and serial in (r[6], r[7])]
    if not rows and serial not in known:
        raise RequestError(
            "--story", serial, "a serial or tail of the fleet", "see engines.csv, modules.csv, parts.csv"
        )
    ready = prepare(scenario, strategy)
    as_of = fleet.settings.as_of
    found = []
    for r in sorted(rows, key=lambda row: (row[1], row[2])):
        kind = KINDS[r[0]]
        if kind == "cost":
            words = f"cost: {' '.join(ready.setup.catalogue.items[r[4]].key)} x {r[5]:.3f}"
        else:
            words = _WORDS.get(kind, kind).format(
                other=r[7] or r[6], detail=r[8], cycles=r[9], hours=r[10], amount=r[5]
            )
        if serial != r[6]:
            words = f"{r[6]} {words}"
        found.append((as_of + dt.timedelta(days=int(r[1])), as_of + dt.timedelta(days=int(r[2])), words))
    return found
