"""The answer for the engine that just came off (or will): three ways costed, the break-even, one sentence."""

from __future__ import annotations

from typing import NamedTuple

from planner.break_even import BreakEven, break_even
from planner.off_wing import off_now
from planner.ways_out import SHELVES, Off, Way, costed_ways
from sim.fleet import Fleet

NAMES = {
    "A1": "the whole engine to the shop for that module only (A1)",
    "A2": "the core visit brought forward (A2)",
    "B": "an exchange of the module (B)",
}
CAUSES = {
    "limit": "a part's limit",
    "directive": "a directive's limit",
    "unknown_life": "a part of unknown life",
    "finding": "a finding",
    "margin": "EGT margin",
}


class ThreeWays(NamedTuple):
    """All ways with both shelves (the exchanges sorted by cost), the break-even, and the answer in words."""

    off: Off
    ways: tuple[Way, ...]
    break_even: BreakEven
    sentence: str

    def best(self, shelf: str) -> Way:
        """Return the cheapest way with a shelf; ties go to the name."""
        return min((way for way in self.ways if way.shelf == shelf), key=lambda way: (way.cost_usd, way.way))

    def one(self, way: str, shelf: str) -> Way:
        """Return the cheapest way of a name with a shelf."""
        return min((one for one in self.ways if (one.way, one.shelf) == (way, shelf)), key=lambda one: one.cost_usd)

    def rows(self) -> list[dict[str, object]]:
        """Return every line of the cheapest way of each name and shelf, as rows of the table ``ways``."""
        rows: list[dict[str, object]] = []
        for shelf in SHELVES:
            for name in NAMES:
                way = self.one(name, shelf)
                totals: dict[str, list[float]] = {}
                for line in way.lines:
                    total = totals.setdefault(line.line, [0.0, 0.0])
                    total[0] += line.cost_usd
                    total[1] += line.cash_usd if line.line not in ("life bought", "spare tied up", "shelf") else 0.0
                rows += [
                    {
                        "engine_serial": self.off.engine.serial,
                        "way": name,
                        "shelf": shelf,
                        "line": line,
                        "cost_usd": worth,
                        "cash_usd": cash,
                        "days_without": way.days_without,
                    }
                    for line, (worth, cash) in totals.items()
                ]
        return rows


def three_ways(fleet: Fleet, engine_serial: str) -> ThreeWays:
    """Return the three ways out for one engine. Raises RequestError when it does not come off."""
    off = off_now(fleet, engine_serial)
    ways = tuple(way for shelf in SHELVES for way in costed_ways(off, shelf=shelf))
    answer = ThreeWays(off, ways, break_even(off), "")
    return answer._replace(sentence=_sentence(answer))


def _sentence(answer: ThreeWays) -> str:
    off, full, empty = answer.off, answer.best("full"), answer.best("empty")
    when = off.view.setup.season.date(off.seen.day)
    why = CAUSES.get(off.seen.cause, off.seen.cause)
    module = off.seen.spec.modules[off.seen.slot].module if off.seen.slot >= 0 else ""
    others = [answer.one(name, "full") for name in NAMES if name != full.way]
    ahead = min(other.cost_usd for other in others) - full.cost_usd
    text = f"{off.engine.serial} comes off {off.tail} on {when} for {why}{f' of its {module}' if module else ''}: "
    text += f"cheapest is {NAMES[full.way]}"
    if full.way == "B" and full.module_serial:
        text += f" with {full.module_serial}"
    elif full.way == "B":
        text += " if a module lay on the shelf, and none does"
    text += f", {ahead / 1e3:,.0f} thousand USD ahead of the next way at present value"
    text += f" and {full.days_without:.0f} days without the engine"
    if empty.way == full.way:
        other = min(answer.one(name, "empty").cost_usd for name in NAMES if name != empty.way)
        text += f"; with an empty shelf it is still cheapest, by {(other - empty.cost_usd) / 1e3:,.0f} thousand USD."
    else:
        text += f"; with an empty shelf the cheapest is {NAMES[empty.way]}."
    even = answer.break_even
    if even.least_cycles is None:
        text += f" At no core life up to {even.tried_cycles:,} cycles would an exchange beat the core visit."
    elif even.least_cycles == 0:
        text += " An exchange beats the core visit at any core life."
    else:
        text += f" An exchange beats the core visit from {even.least_cycles:,} cycles of core life on;"
        text += f" {even.core_left_cycles:,} are left."
    return text
