"""The question ``holdings``: how many spare engines and which modules, where, at what cost, with what cover.

Everything here is by formula, at once, from planner/demand.py; planner/holdings_runs.py confirms it by simulation.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any, NamedTuple

from planner.demand import Demand, demands
from planner.holdings_best import HoldingsRequest, best_holdings, drawn_curve, reach_usd, target_of, today_of
from planner.holdings_effects import breaks, places, steps, ways
from planner.holdings_model import Change, Model, model
from planner.holdings_money import Money, cost_of, exchange_savings, money
from planner.picture import Picture
from planner.scenario import check_item
from planner.stock.indentures import Holding, cheapest_for, efficient_holdings, holding
from sim.errors import NoSolutionError, RequestError
from sim.fleet import Fleet

Row = dict[str, Any]


class Prepared(NamedTuple):
    """A fleet's demand under one strategy, read once for many questions (sliders move only what is computed
    after)."""

    fleet: Fleet
    strategy: str
    view: Picture
    demands: tuple[Demand, ...]
    saved_usd: dict[str, dict[int, float]]


class TypeAnswer(NamedTuple):
    """One type: its model and prices, today's holding, the curve drawn, the best holding and why it is the best."""

    model: Model
    money: Money
    today: Holding
    curve: tuple[Holding, ...]
    best: Holding
    why: str


class Holdings(NamedTuple):
    """The answer: rows of the tables of spare holdings, sentences, warnings, and what was asked."""

    curve: list[Row]
    best: list[Row]
    steps: list[Row]
    breaks: list[Row]
    ways: list[Row]
    places: list[Row]
    sentences: list[str]
    warnings: list[str]
    types: tuple[TypeAnswer, ...]
    request: HoldingsRequest

    def as_result(self) -> dict[str, Any]:
        """Return the tables as ``--json`` names them."""
        return {
            "curve": self.curve,
            "best": self.best,
            "steps": self.steps,
            "breaks": self.breaks,
            "ways": self.ways,
            "places": self.places,
            "sentences": self.sentences,
        }


def prepare(fleet: Fleet, strategy: str = "") -> Prepared:
    """Return a fleet's demand over its horizon. Raises RequestError for a strategy that the fleet does not have."""
    if not fleet.strategies:
        raise RequestError("strategies", "no row", "at least one strategy", "add a row to strategies.csv")
    name = strategy or fleet.strategies[0].strategy
    months = max(12, round(fleet.settings.horizon_years * 12.0))
    view, found = demands(fleet, name, months=months)
    row = next(s for s in fleet.strategies if s.strategy == name)
    saved: dict[str, dict[int, float]] = {d.engine_type: {} for d in found}
    if row.way_out != "whole_engine":
        saved = {d.engine_type: exchange_savings(view, view.setup.types[d.engine_type]) for d in found}
    return Prepared(fleet, name, view, found, saved)


def holdings(prepared: Prepared, request: HoldingsRequest) -> Holdings:
    """Return the answer by formula.

    Raises RequestError for a type, item, stock, budget or target that cannot be, NoSolutionError for a target that no
    stock within reach has.
    """
    chosen = _chosen(prepared, request)
    models = [model(prepared.view, demand, request.change) for demand in chosen]
    saved = [prepared.saved_usd[demand.engine_type] for demand in chosen]
    prices = [money(prepared.view, one, usd) for one, usd in zip(models, saved, strict=True)]
    bests = best_holdings(prepared.fleet, request, models)
    answers, curve, best_rows = [], [], []
    for one, price, (best, why) in zip(models, prices, bests, strict=True):
        today = today_of(one)
        drawn = drawn_curve(one)
        answer = TypeAnswer(one, price, today, drawn, best, why)
        answers.append(answer)
        curve += _curve_rows(answer, _asked_holding(request, one))
        best_rows.append(_best_row(prepared, answer))
    view = prepared.view
    targets = [target_of(prepared.fleet, request, one) for one in models]
    found = list(zip(answers, chosen, targets, saved, strict=True))
    return Holdings(
        curve,
        best_rows,
        [row for a, _, _, _ in found for row in steps(a.model, a.money, a.today)],
        [row for a, d, t, s in found for row in breaks(view, d, request.change, t, saved_usd=s, today=a.today)],
        [row for a, _, t, _ in found for row in ways(view, a.model, a.money, a.today, t)],
        [row for a in answers for row in places(view, a.model, most=max(a.best.engines, a.today.engines) + 2)],
        [sentence for a, d, t, _ in found for sentence in _sentences(prepared, a, d, t)],
        _warnings(prepared, answers),
        tuple(answers),
        request,
    )


def _chosen(prepared: Prepared, request: HoldingsRequest) -> list[Demand]:
    names = [d.engine_type for d in prepared.demands]
    if request.engine_type and request.engine_type not in names:
        raise RequestError("--type", request.engine_type, f"one of {', '.join(names)}")
    found = [d for d in prepared.demands if request.engine_type in ("", d.engine_type) and d.positions]
    if not found:
        raise RequestError("--type", request.engine_type or "no type", "a type with engines on the wing")
    for row in request.stock:
        check_item(prepared.fleet, row)
    return found


def _asked_holding(request: HoldingsRequest, one: Model) -> list[Holding]:
    wanted: dict[str, int] = {}
    for row in request.stock:
        if row.engine_type == one.kind.engine_type:
            wanted[row.module] = wanted.get(row.module, 0) + row.count
    if not wanted:
        return []
    stocks = [wanted.get(m.module, m.held) for m in one.modules]
    return [holding(one.engine, one.modules, engines=wanted.get("engine", one.engine.held), stocks=stocks)]


def stocks_of(one: Model, choice: Holding, places_of: dict[str, int] | None = None) -> dict[str, int]:
    """Return a holding as numbers by item at base; ``places_of``: engines by base."""
    engines = {f"engine at {base}": n for base, n in (places_of or {}).items() if n} or {"engine": choice.engines}
    modules = {m.module: n for m, n in zip(one.modules, choice.modules, strict=True) if n}
    return {**engines, **modules}


def least_cost(answer: TypeAnswer) -> Holding:
    """Return the holding on the drawn curve that costs least in all."""
    return min(answer.curve, key=lambda c: cost_of(answer.model, answer.money, c).total_usd)


def engines_without_exchange(prepared: Prepared, answer: TypeAnswer, demand: Demand, target: float) -> int | None:
    """Return the spare engines that the target asks for if no module were exchanged; None where no stock reaches
    it."""
    bare = model(prepared.view, demand, replace(Change(), exchanges=False))
    try:
        return cheapest_for(efficient_holdings(bare.engine, (), budget_usd=reach_usd(bare)), target).engines
    except NoSolutionError:
        return None


def _curve_rows(answer: TypeAnswer, asked: Sequence[Holding]) -> list[Row]:
    today_usd = cost_of(answer.model, answer.money, answer.today).total_usd
    on_curve = {(c.engines, c.modules) for c in answer.curve}
    rows = []
    choices = [*answer.curve, answer.today, answer.best, *asked]
    seen: set[tuple[int, tuple[int, ...]]] = set()
    for choice in sorted(choices, key=lambda c: (c.price_usd, c.cover_frac)):
        key = (choice.engines, choice.modules)
        if key in seen:
            continue
        seen.add(key)
        total = cost_of(answer.model, answer.money, choice).total_usd
        rows.append(
            {
                "engine_type": answer.model.kind.engine_type,
                "stocks": stocks_of(answer.model, choice),
                "spares_price_usd": choice.price_usd,
                "total_usd": total,
                "against_today_usd": total - today_usd,
                "cover_frac": choice.cover_frac,
                "engines_short_mean": choice.short_mean,
                "by": "formula",
                "on_curve": "yes" if key in on_curve or key == (answer.best.engines, answer.best.modules) else "no",
                "engines": choice.engines,
                "runs": None,
                "today": "yes" if key == (answer.today.engines, answer.today.modules) else "no",
            }
        )
    return rows


def _best_row(prepared: Prepared, answer: TypeAnswer) -> Row:
    found = places(prepared.view, answer.model, most=answer.best.engines)
    at = {row["base"]: row["count"] for row in found if row["engines"] == answer.best.engines}
    return {
        "engine_type": answer.model.kind.engine_type,
        "stocks": stocks_of(answer.model, answer.best, at),
        "spares_price_usd": answer.best.price_usd,
        "total_usd": cost_of(answer.model, answer.money, answer.best).total_usd,
        "cover_frac": answer.best.cover_frac,
        "engines_short_mean": answer.best.short_mean,
        "by": "formula",
        "sure": f"{answer.why}; exact for the formula, not yet simulated",
    }


def _sentences(prepared: Prepared, answer: TypeAnswer, demand: Demand, target: float) -> list[str]:
    kind, today, best = answer.model.kind.engine_type, answer.today, answer.best
    words = ", ".join(f"{n} {item}" for item, n in stocks_of(answer.model, best).items())
    usd = cost_of(answer.model, answer.money, best).total_usd - cost_of(answer.model, answer.money, today).total_usd
    result = [
        f"Type {kind}: today's {today.engines} spare engines cover {today.cover_frac:.0%} of the time "
        f"({today.short_mean:.1f} engines short on average); {target:.0%} is wanted.",
        f"Type {kind}: {answer.why} is {words}: cover {best.cover_frac:.1%}, price {best.price_usd / 1e6:,.1f} M USD, "
        f"{usd / 1e6:+,.1f} M USD against today over the horizon.",
    ]
    cheap = least_cost(answer)
    if (cheap.engines, cheap.modules) != (best.engines, best.modules):
        less = ", ".join(f"{n} {item}" for item, n in stocks_of(answer.model, cheap).items()) or "nothing"
        result.append(f"Type {kind}: least cost in all is reached with {less} (cover {cheap.cover_frac:.1%}).")
    if answer.model.modules:
        bare = engines_without_exchange(prepared, answer, demand, target)
        if bare is not None:
            result.append(
                f"Type {kind}: exchanging modules as in that holding stands in for {bare - best.engines} spare engines "
                f"({bare} would be needed without)."
            )
    return result


def _warnings(prepared: Prepared, answers: Sequence[TypeAnswer]) -> list[str]:
    found = [
        f"strategy {prepared.strategy}; spares of a type serve all bases; the formula's cost leaves out what no stock "
        "moves",
    ]
    for answer in answers:
        kind = answer.model.kind.engine_type
        if answer.model.load_frac >= 0.9:
            found.append(
                f"type {kind} uses {answer.model.load_frac:.0%} of its shop slots: a good part of the days away "
                f"({answer.model.wait_days:.0f}) is the wait for one, and more slots may be cheaper than more spares"
            )
        lying = sum(1 for m in prepared.fleet.modules if m.engine_type == kind and not m.engine_serial)
        usable = sum(m.held for m in answer.model.modules)
        if answer.model.modules and lying > usable:
            found.append(
                f"type {kind}: {lying - usable} of {lying} modules outside engines fit fewer than half of the engines "
                "or are never asked for, and are not counted"
            )
    return [*found, *prepared.fleet.assumptions]
