"""The formula's best holdings confirmed by simulation: candidates near its curve under common luck, the best
selected.

The selection drops a candidate as soon as it is sure to cost more (planner/select_best.py, Kim and Nelson 2001):
with at least the promised chance the one that is left costs least of all, if it is cheaper than every other by
the difference that matters; that is a quarter of what a spare engine's capital costs over the horizon unless
another is asked for.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from contextlib import closing
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner import fingerprint
from planner.execute import Where, execute
from planner.execute_tally import Listener
from planner.holdings import Holdings, Prepared, TypeAnswer, least_cost, stocks_of
from planner.holdings_job import StockRow, stock_job
from planner.job import Scenario
from planner.kept import Kept
from planner.scenario import WhatIf, apply, with_stock
from planner.select_best import Rule, Selected, select
from planner.sequential import paired_interval
from planner.stock.indentures import Holding, holding
from sim.errors import RequestError
from sim.fleet import Fleet
from sim.fleet import Holding as StockHeld

Floats = NDArray[np.float64]
Row = dict[str, Any]
MOST_CANDIDATES = 7
DELTA_SHARE = 0.25  # of one spare engine's capital over the horizon: differences below do not matter
TODAY = "today"


@dataclass(frozen=True, slots=True, kw_only=True)
class ConfirmRequest:
    """What is asked: runs at most for each candidate, the promise, the difference that does not matter (None: a
    quarter
    of a spare engine's capital over the horizon), the seed."""

    runs: int = 64
    level_frac: float = 0.95
    delta_usd: float | None = None
    seed: int = 1


class Confirmed(NamedTuple):
    """One type's candidates simulated: rows by candidate in run order, the selection, and rows of the tables."""

    engine_type: str
    candidates: dict[str, Holding]
    rows: dict[str, list[StockRow]]
    selected: Selected
    curve: list[Row]
    best: Row
    sentences: list[str]


def candidates(answer: TypeAnswer) -> dict[str, Holding]:
    """Return the holdings worth simulating by name: today's, the best, one engine more and fewer, the least cost, and
    the curve's points between."""
    best, today = answer.best, answer.today

    def moved(engines: int) -> Holding:
        return holding(answer.model.engine, answer.model.modules, engines=engines, stocks=best.modules)

    wanted = [today, best, moved(best.engines + 1)]
    if best.engines > 0:
        wanted.append(moved(best.engines - 1))
    wanted.append(least_cost(answer))
    low, high = sorted((today.price_usd, best.price_usd))
    between = [c for c in answer.curve if low < c.price_usd < high]
    wanted += [between[len(between) * i // 3] for i in (2, 1)] if len(between) > 2 else between
    found: dict[str, Holding] = {}
    for choice in wanted:
        if choice not in found.values() and len(found) < MOST_CANDIDATES:
            found[_name(answer, choice, today)] = choice
    return found


def _name(answer: TypeAnswer, choice: Holding, today: Holding) -> str:
    words = ", ".join(f"{item} {n}" for item, n in stocks_of(answer.model, choice).items())
    return f"{TODAY}: {words}" if choice == today else words


def fleet_with(prepared: Prepared, answer: TypeAnswer, choice: Holding, what_if: WhatIf) -> Fleet:
    """Return the fleet with a holding of one type in place of what it has of it; today's holding is the fleet as
    it is."""
    fleet = apply(prepared.fleet, what_if)
    if choice == answer.today:
        return fleet
    kind = answer.model.kind.engine_type
    rows = [StockHeld(engine_type=kind, module="engine", count=choice.engines)]
    for module, now, then in zip(answer.model.modules, answer.today.modules, choice.modules, strict=True):
        if now != then:
            # modules that fit few engines are not counted in a holding, and stay as well
            idle = sum(
                1 for m in fleet.modules if (m.engine_type, m.module) == (kind, module.module) and not m.engine_serial
            )
            rows.append(StockHeld(engine_type=kind, module=module.module, count=then + max(0, idle - now)))
    return with_stock(fleet, tuple(rows))


def confirm(
    prepared: Prepared,
    found: Holdings,
    request: ConfirmRequest,
    *,
    where: Where,
    home: Path | None = None,
    progress: Listener | None = None,
    cancelled: Callable[[], bool] = lambda: False,
    notice: Callable[[str], None] = lambda text: None,
) -> tuple[Confirmed, ...]:
    """Return each type's candidates simulated, the other types at what they hold today.

    ``home``: where runs are kept by content (None: neither read nor written). Raises RequestError for fewer than
    2 runs.
    """
    if request.runs < 2:
        raise RequestError("--runs", str(request.runs), "2 or more, since a difference needs a spread")
    if found.request.removals != 1.0 or found.request.slots != 1.0:
        raise RequestError(
            "confirmation by simulation",
            "a factor on removals or slots",
            "the plan as recorded (turn times may be scaled)",
            "change the fleet's tables to simulate other removals or slots",
        )
    options: dict[str, Any] = {
        "where": where,
        "home": home,
        "progress": progress,
        "cancelled": cancelled,
        "notice": notice,
    }
    return tuple(_one_type(prepared, found, answer, request, **options) for answer in found.types)


def _one_type(
    prepared: Prepared,
    found: Holdings,
    answer: TypeAnswer,
    request: ConfirmRequest,
    *,
    where: Where,
    home: Path | None,
    progress: Listener | None,
    cancelled: Callable[[], bool],
    notice: Callable[[str], None],
) -> Confirmed:
    choices = candidates(answer)
    what_if = WhatIf(turn_time_factor=found.request.turn)
    days = prepared.fleet.settings.horizon_years * 365.25
    payload = {
        name: (
            Scenario(fleet=fleet_with(prepared, answer, choice, what_if), horizon_days=days, seed=request.seed),
            prepared.strategy,
        )
        for name, choice in choices.items()
    }
    rows: dict[str, list[StockRow]] = {name: [] for name in choices}
    delta = request.delta_usd or DELTA_SHARE * answer.money.engine_capital
    rule = Rule(
        delta_usd=delta,
        level_frac=request.level_frac,
        first_runs=min(16, request.runs),
        most_runs=request.runs,
    )

    def sample(names: Sequence[str], start: int, stop: int) -> dict[str, Floats]:
        tasks = [(name, run) for run in range(start, stop) for name in names]
        results = execute(
            stock_job, payload, tasks, where=where, kept=kept, progress=progress, cancelled=cancelled, notice=notice
        )
        with closing(results):  # type: ignore[type-var]  # an iterator here is a generator
            for (name, _), row in results:
                rows[name].append(row)
        return {name: np.array([row.total_usd for row in rows[name][start:stop]]) for name in names}

    if home is None:
        kept: Kept[Any] | None = None
        selected = select(tuple(choices), sample, rule=rule, cancelled=cancelled)
    else:
        keys = {name: fingerprint.of(payload[name], fingerprint.sources()) for name in payload}
        with Kept(home, keys, StockRow) as kept:
            selected = select(tuple(choices), sample, rule=rule, cancelled=cancelled)
    return _told(prepared, answer, choices, rows, selected, rule)


def _told(
    prepared: Prepared,
    answer: TypeAnswer,
    choices: dict[str, Holding],
    rows: dict[str, list[StockRow]],
    selected: Selected,
    rule: Rule,
) -> Confirmed:
    kind = answer.model.kind.engine_type
    number = [t.engine_type for t in prepared.fleet.engine_types].index(kind)
    today = next((name for name in choices if name.startswith(TODAY)), None)
    curve = [_row(answer, choices, rows, name, number, today) for name in choices if rows[name]]
    best = next((row for row in curve if row["_name"] == selected.best), None)
    sure = _sure(selected, rule)
    best_row: Row = {}
    if best is not None:
        best_row = {
            key: best[key]
            for key in (
                "engine_type",
                "stocks",
                "spares_price_usd",
                "total_usd",
                "cover_frac",
                "engines_short_mean",
                "by",
            )
        } | {"sure": sure}
    sentences = [f"Type {kind}, simulated: {selected.best} costs least; {sure}."] if best is not None else []
    sentences += _against_runner_up(kind, rows, selected)
    sentences += [_parted(answer, choices[row["_name"]], rows[row["_name"]], number) for row in curve if row is best]
    for row in curve:
        del row["_name"]
    return Confirmed(kind, choices, rows, selected, curve, best_row, sentences)


def _row(
    answer: TypeAnswer,
    choices: dict[str, Holding],
    rows: dict[str, list[StockRow]],
    name: str,
    number: int,
    today: str | None,
) -> Row:
    choice, own = choices[name], rows[name]
    total = float(np.mean([row.total_usd for row in own]))
    against = None
    if today is not None and rows[today]:
        pairs = min(len(own), len(rows[today]))
        against = float(
            np.mean([a.total_usd - b.total_usd for a, b in zip(own[:pairs], rows[today][:pairs], strict=True)])
        )
    return {
        "_name": name,
        "engine_type": answer.model.kind.engine_type,
        "stocks": stocks_of(answer.model, choice),
        "spares_price_usd": choice.price_usd,
        "total_usd": total,
        "against_today_usd": against,
        "cover_frac": float(np.mean([row.cover[number] for row in own])),
        "engines_short_mean": float(np.mean([row.short[number] for row in own])),
        "by": "simulation",
        "on_curve": "yes" if choice in answer.curve or choice == answer.best else "no",
        "engines": choice.engines,
        "runs": len(own),
        "today": "yes" if name == today else "no",
    }


def _sure(selected: Selected, rule: Rule) -> str:
    """Return how sure the selection is, and on what."""
    million = rule.delta_usd / 1e6
    if selected.reason == "decided":
        return (
            f"with a chance of at least {rule.level_frac:.0%} it is the cheapest of the {len(selected.totals)} "
            f"simulated if it is cheaper than every other by {million:.2f} M USD (Kim and Nelson 2001), "
            f"{selected.runs} runs"
        )
    left = len(selected.left)
    why = "stopped by hand" if selected.reason == "cancelled" else "the runs allowed are used up"
    return (
        f"undecided among {left} of {len(selected.totals)} ({why} after {selected.runs} runs; differences of "
        f"{million:.2f} M USD were to be told apart): shown is the least mean so far"
    )


def _against_runner_up(kind: str, rows: dict[str, list[StockRow]], selected: Selected) -> list[str]:
    """Return the paired interval of the best against the one that was dropped last, or is left beside it."""
    others = [name for name in selected.left if name != selected.best] or [name for name, _ in selected.dropped[-1:]]
    result = []
    for name in others[:1]:
        pairs = min(len(rows[name]), len(rows[selected.best]))
        if pairs < 2:
            continue
        own = [row.total_usd for row in rows[selected.best][:pairs]]
        gap = paired_interval([row.total_usd for row in rows[name][:pairs]], own)
        result.append(
            f"Type {kind}: {name} costs {gap.mean / 1e6:+.2f} M USD against it (95 % interval {gap.low / 1e6:+.2f} to "
            f"{gap.high / 1e6:+.2f}, {pairs} runs)."
        )
    return result


def _parted(answer: TypeAnswer, choice: Holding, own: list[StockRow], number: int) -> str:
    """Return formula against simulation for one holding, with what explains the difference."""
    cover = float(np.mean([row.cover[number] for row in own]))
    removals = float(np.mean([row.removals[number] for row in own]))
    waits = float(np.mean([row.waits[number] for row in own]))
    planned = answer.model.per_day * 365.25
    reasons = [
        f"removals a year {planned:.1f} by formula, {removals:.1f} simulated (an aircraft that stands removes nothing)",
    ]
    if answer.model.load_frac > 0.7:
        reasons.append(
            f"slots loaded to {answer.model.load_frac:.0%}: the formula takes the queue's mean wait of "
            f"{answer.model.wait_days:.0f} days, the simulation its ups and downs"
        )
    reasons.append("planned removals come on dates that the formula only spreads by quarter-years or more")
    return (
        f"Type {answer.model.kind.engine_type}: own engines suffice for {choice.cover_frac:.0%} of the time by "
        f"formula, {cover:.0%} simulated (an aircraft stands for {waits:.0%} of it, engines leased in help out); "
        + "; ".join(reasons)
        + "."
    )


def with_runs(found: Holdings, confirmed: Sequence[Confirmed]) -> Holdings:
    """Return the answer with the simulated rows beside the formula's."""
    return found._replace(
        curve=[*found.curve, *(row for one in confirmed for row in one.curve)],
        best=[*found.best, *(one.best for one in confirmed if one.best)],
        sentences=[*found.sentences, *(s for one in confirmed for s in one.sentences)],
        request=replace(found.request),
    )
