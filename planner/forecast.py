"""The question ``forecast``: the removals ahead, by engine and by month, and what they ask of spares and shops.

Works in closed form on planner/demand.py; with runs it simulates the same months beside it and shows both.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any, NamedTuple

from planner.causes_ahead import ahead
from planner.demand import Demand, demands
from planner.execute import Where
from planner.execute_tally import Listener
from planner.forecast_engines import binding, causes_of, engine_rows
from planner.forecast_months import SPANS, cause_rows, months_rows, span_rows
from planner.forecast_runs import Simulated, simulated
from planner.picture import Picture, nearest
from sim.errors import RequestError
from sim.fleet import Fleet

Row = dict[str, Any]
UTILISATION_STEP = 0.10  # changes of use that the effects show: a tenth of the year's use, two points of derate
DERATE_STEP = 0.02
_NAMED = 8  # engines that a sentence lists


@dataclass(frozen=True, slots=True, kw_only=True)
class ForecastRequest:
    """What is asked: strategy (empty: the fleet's first), months ahead, runs to simulate beside it (0: none),
    effects of
    use; ``engine`` on ``tail``: how long an engine (a spare, for instance) would last on a tail, and what ends it."""

    strategy: str = ""
    months: int = 60
    runs: int = 0
    seed: int = 1
    effects: bool = True
    engine: str = ""
    tail: str = ""


class Forecast(NamedTuple):
    """The answer: rows of the tables of the removals ahead, sentences, warnings, and what was asked."""

    removals: list[Row]
    engines: list[Row]
    months: list[Row]
    causes: list[Row]
    spans: list[Row]
    effects: list[Row]
    sentences: list[str]
    warnings: list[str]
    request: ForecastRequest

    def as_result(self) -> dict[str, Any]:
        """Return the tables as ``--json`` names them."""
        return {
            "removals": self.removals,
            "engines": self.engines,
            "months": self.months,
            "month_causes": self.causes,
            "spans": self.spans,
            "effects": self.effects,
            "sentences": self.sentences,
        }


def forecast(
    fleet: Fleet,
    request: ForecastRequest,
    *,
    where: Where | None = None,
    progress: Listener | None = None,
    cancelled: Callable[[], bool] = lambda: False,
) -> Forecast:
    """Return the removals ahead. Raises RequestError for a strategy, engine or tail that the fleet does not have,
    or a
    number of months or runs that cannot be."""
    if request.runs < 0:
        raise RequestError("--runs", str(request.runs), "0 (no simulation) or more")
    if not fleet.strategies:
        raise RequestError("strategies", "no row", "at least one strategy", "add a row to strategies.csv")
    strategy = request.strategy or fleet.strategies[0].strategy
    request = replace(request, strategy=strategy)
    view, found = demands(fleet, strategy, months=request.months)
    removals, engines = engine_rows(view, [one.ahead for demand in found for one in demand.positions])
    months = [row for demand in found for row in months_rows(view, demand)]
    if request.runs:
        seen = simulated(
            fleet, request.strategy, found[0].edges, runs=request.runs, seed=request.seed, where=where or Where(),
            progress=progress, cancelled=cancelled,
        )  # fmt: skip
        _add_simulated(months, seen, found)
    effects = use_effects(fleet, strategy, found) if request.effects else []
    return Forecast(
        removals,
        engines,
        months,
        [row for demand in found for row in cause_rows(view, demand)],
        [row for demand in found for row in span_rows(view, demand)],
        effects,
        [*_asked(view, request), *_sentences(months, engines, found)],
        _warnings(view, found),
        request,
    )


def _add_simulated(months: list[Row], seen: Simulated, found: Sequence[Demand]) -> None:
    number = {d.engine_type: i for i, d in enumerate(found)}
    at: dict[str, int] = dict.fromkeys(number, 0)
    for row in months:
        name = row["engine_type"]
        row["removals_simulated"] = float(seen.removals[number[name], at[name]])
        row["short_chance_simulated"] = float(seen.without_own[number[name], at[name]])
        at[name] += 1


def lasts(view: Picture, engine_serial: str, tail: str) -> str:
    """Return in one sentence how long an engine would last on a tail, and what ends it.

    Raises RequestError for an engine or a tail that the records do not hold, or of another type.
    """
    engine = view.engine(engine_serial)
    if tail not in view.tails:
        near = nearest(tail, tuple(view.tails))
        raise RequestError("tail", tail, "a tail of the records", f"did you mean {near}?" if near else "")
    row = view.tails[tail].row
    if row.engine_type != engine.spec.engine_type:
        raise RequestError("tail", f"{tail} with type {row.engine_type}", f"one of type {engine.spec.engine_type}")
    one = ahead(view, engine, tail)
    return f"{engine_serial} on {tail}: {binding(view, one, causes_of(one))}."


def _asked(view: Picture, request: ForecastRequest) -> list[str]:
    if bool(request.engine) != bool(request.tail):
        raise RequestError("engine on a tail", "one of the two", "both --engine and --tail", "name the other one too")
    return [lasts(view, request.engine, request.tail)] if request.engine else []


def use_effects(fleet: Fleet, strategy: str, plan: Sequence[Demand]) -> list[Row]:
    """Return what changes of utilisation, derate and base do to the removals in 12, 36 and 60 months."""
    rows = [_effect(demand, "as planned", demand) for demand in plan]
    months = plan[0].months if plan else SPANS[-1]
    for name, changed in _changes(fleet):
        _, found = demands(fleet, strategy, months=months, flown_as=changed)
        rows += [_effect(demand, name, before) for demand, before in zip(found, plan, strict=True)]
    return sorted(rows, key=lambda row: row["engine_type"])


def _changes(fleet: Fleet) -> list[tuple[str, Fleet]]:
    def with_rows(**factors: Any) -> Fleet:
        return replace(
            fleet, aircraft=tuple(replace(a, **{k: f(a) for k, f in factors.items()}) for a in fleet.aircraft)
        )

    found = []
    for sign in (1.0, -1.0):
        factor = 1.0 + sign * UTILISATION_STEP
        use = replace(
            with_rows(
                hours_per_year=lambda a, f=factor: a.hours_per_year * f,
                cycles_per_year=lambda a, f=factor: a.cycles_per_year * f,
            ),
            utilisation=tuple(
                replace(u, hours_per_year=u.hours_per_year * factor, cycles_per_year=u.cycles_per_year * factor)
                for u in fleet.utilisation
            ),
        )
        found.append((f"utilisation {sign * UTILISATION_STEP:+.0%}", use))
    for sign in (1.0, -1.0):
        found.append(
            (
                f"derate {sign * DERATE_STEP * 100:+.0f} points",
                with_rows(average_derate_frac=lambda a, s=sign: max(0.0, a.average_derate_frac + s * DERATE_STEP)),
            )
        )
    for base in sorted({a.base for a in fleet.aircraft}):
        if len({a.base for a in fleet.aircraft}) > 1:
            found.append((f"all at {base}", with_rows(base=lambda a, b=base: b)))
    return found


def _effect(demand: Demand, change: str, before: Demand) -> Row:
    row: Row = {"engine_type": demand.engine_type, "change": change}
    for months in SPANS:
        row[f"removals_{months}"] = float(demand.rates[:, :months].sum()) if months <= demand.months else None
    last = [m for m in SPANS if m <= demand.months]
    row["difference_60"] = (
        float(demand.rates[:, : last[-1]].sum() - before.rates[:, : last[-1]].sum())
        if last and last[-1] == SPANS[-1]
        else None
    )
    return row


def _sentences(months: list[Row], engines: list[Row], found: Sequence[Demand]) -> list[str]:
    result = []
    for demand in found:
        own = [row for row in months if row["engine_type"] == demand.engine_type]
        if not demand.positions:
            continue
        year = sum(row["removals"] for row in own[:12])
        worst = max(own, key=lambda row: row["short_chance"])
        result.append(
            f"Type {demand.engine_type}: {year:.1f} removals in the next {min(12, len(own))} months; the month most "
            f"short of engines is {worst['month']:%Y-%m}, with {worst['away']:.1f} away against {worst['spares']} "
            f"spares (short with a chance of {worst['short_chance']:.0%})."
        )
        over = [row for row in own if row["slots"] is not None and row["slots_needed"] > row["slots"] + 0.5]
        if over:
            result.append(
                f"Type {demand.engine_type}: more engines ask for slots than there are in {len(over)} of {len(own)} "
                f"months, first in {over[0]['month']:%Y-%m}."
            )
    weak = [row["engine_serial"] for row in engines if row["summer_chance"] < 0.5]
    if engines:
        named = f", not {', '.join(weak[:_NAMED])}{' and others' if len(weak) > _NAMED else ''}" if weak else ""
        result.append(
            f"{len(engines) - len(weak)} of {len(engines)} engines are more likely than not to last past the "
            f"summer{named}."
        )
    return result


def _warnings(view: Picture, found: Sequence[Demand]) -> list[str]:
    result = [
        "margin today is taken as the records give it, so its date has no band; margin forecasts are statistics and "
        "defer no inspection"
    ]
    for demand in found:
        if demand.shops.load_frac >= 1.0:
            result.append(
                f"type {demand.engine_type} asks for {demand.shops.load_frac:.0%} of its shop slots: the queue grows "
                "and the days away are those of the mean queue over the months shown"
            )
    unknown = {
        one.engine_serial
        for demand in found
        for one in demand.positions
        if any(p.cause == "unknown_life" for p in one.ahead.planned)
    }
    if unknown:
        result.append(f"flies without a known life: {', '.join(sorted(unknown))}; unknown history is no life")
    return [*result, *view.fleet.assumptions]
