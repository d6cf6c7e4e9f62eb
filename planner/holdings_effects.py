"""What one more or fewer does, what breaks a holding, how else to have a spare at hand, and where to hold them."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from planner.demand import Demand
from planner.holdings_model import Change, Model, model
from planner.holdings_money import Money, cost_of, money
from planner.picture import Picture
from planner.stock.echelons import Base, best_places
from planner.stock.indentures import Holding, holding

Row = dict[str, Any]
_STEP_FRAC = 0.20  # what goes wrong goes wrong by a fifth
_CAMPAIGN_FRAC = 0.10


def steps(one: Model, prices: Money, today: Holding) -> list[Row]:
    """Return the rows of holdings_steps: one more and one fewer of every item against today's holding."""
    base_usd = cost_of(one, prices, today).total_usd
    rows = []
    for item in range(-1, len(one.modules)):
        name = "engine" if item < 0 else one.modules[item].module
        held = today.engines if item < 0 else today.modules[item]
        for change in (1, -1):
            if held + change < 0:
                continue
            engines = today.engines + (change if item < 0 else 0)
            stocks = [n + (change if i == item else 0) for i, n in enumerate(today.modules)]
            then = holding(one.engine, one.modules, engines=engines, stocks=stocks)
            rows.append(
                {
                    "engine_type": one.kind.engine_type,
                    "item": name,
                    "change": change,
                    "held": held,
                    "price_usd": one.engine.price_usd if item < 0 else one.modules[item].price_usd,
                    "cover_frac": then.cover_frac,
                    "cover_gain_frac": then.cover_frac - today.cover_frac,
                    "short_saved": today.short_mean - then.short_mean,
                    "worth_usd": base_usd - cost_of(one, prices, then).total_usd,
                }
            )
    return rows


def named_changes(plan: Change) -> list[tuple[str, Change]]:
    """Return what may go wrong (or right), by name, on top of the plan."""
    return [
        ("as planned", plan),
        (f"turn time +{_STEP_FRAC:.0%}", replace(plan, turn=plan.turn * (1.0 + _STEP_FRAC))),
        (f"turn time -{_STEP_FRAC:.0%}", replace(plan, turn=plan.turn * (1.0 - _STEP_FRAC))),
        ("turn time +1 day", replace(plan, turn_days=plan.turn_days + 1.0)),
        (f"removals +{_STEP_FRAC:.0%}", replace(plan, removals=plan.removals * (1.0 + _STEP_FRAC))),
        (f"removals -{_STEP_FRAC:.0%}", replace(plan, removals=plan.removals * (1.0 - _STEP_FRAC))),
        (f"campaign on {_CAMPAIGN_FRAC:.0%} of engines", replace(plan, campaign_frac=_CAMPAIGN_FRAC)),
        (f"slots -{_STEP_FRAC:.0%}", replace(plan, slots=plan.slots * (1.0 - _STEP_FRAC))),
        (f"slots +{_STEP_FRAC:.0%}", replace(plan, slots=plan.slots * (1.0 + _STEP_FRAC))),
        ("no date is sure (Poisson)", replace(plan, spread=1.0)),
    ]


def breaks(
    view: Picture, demand: Demand, plan: Change, target: float, *, saved_usd: Mapping[int, float], today: Holding
) -> list[Row]:
    """Return the rows of holdings_breaks: today's holding under each change, and the engines that the target asks for
    then with today's modules."""
    rows: list[Row] = []
    first_cover = first_usd = 0.0
    for name, change in named_changes(plan):
        one = model(view, demand, change)
        prices = money(view, one, saved_usd)
        then = holding(one.engine, one.modules, engines=today.engines, stocks=today.modules)
        usd = cost_of(one, prices, then).total_usd
        if not rows:
            first_cover, first_usd = then.cover_frac, usd
        rows.append(
            {
                "engine_type": demand.engine_type,
                "change": name,
                "cover_frac": then.cover_frac,
                "cover_change_frac": then.cover_frac - first_cover,
                "engines_short_mean": then.short_mean,
                "cost_change_usd": usd - first_usd,
                "engines_for_target": engines_for(one, then, target),
            }
        )
    return rows


def engines_for(one: Model, today: Holding, target: float) -> int | None:
    """Return the least number of engines with a cover, the modules as they are; None beyond 200."""
    added = np.array([today.added_mean])
    for most in (24, 60, 200):
        below = one.engine.cover(added, most).cover_frac[0]
        if below[-1] >= target:
            return int(np.searchsorted(below, target - 1e-12))
    return None


def ways(view: Picture, one: Model, prices: Money, today: Holding, target: float) -> list[Row]:
    """Return the rows of holdings_ways: what one more engine costs when bought, leased for long, shared, or gone
    without.

    The days on which it is used are those on which it spares a shortage.
    """
    fleet, kind = view.fleet, one.kind.engine_type
    then = holding(one.engine, one.modules, engines=today.engines + 1, stocks=today.modules)
    short_saved = today.short_mean - then.short_mean
    rate = fleet.settings.discount_rate_frac + fleet.settings.spare_keeping_frac_per_year
    buy = one.engine.price_usd * rate
    market = view.setup.market.get(kind)

    def row(way: str, usd_per_year: float, words: str, saved: float = short_saved) -> Row:
        used_days = 365.25 * short_saved
        return {
            "engine_type": kind,
            "way": way,
            "usd_per_year": usd_per_year,
            "usd_per_day_used": usd_per_year / used_days if used_days > 0.0 and way != "share a pool" else None,
            "short_saved": saved,
            "words": words,
        }

    million = one.engine.price_usd / 1e6
    rows = [row("buy", buy, f"capital and keeping at {rate:.1%} of {million:.1f} M USD; at hand, yours to sell")]
    if market is not None:
        words = (
            f"rent of a standing lease, hours and cycles flown at {market.usd_per_hour:,.0f} and "
            f"{market.usd_per_cycle:,.0f} USD beside it; found with a chance of {market.chance:.0%} at a request"
        )
        rows.append(row("lease", market.usd_per_month * 12.0, words))
    fewer = pooled_saving(one, today, target)
    words = f"with a second fleet like this one {target:.0%} cover asks for {2.0 * fewer:.0f} engines fewer together; "
    rows.append(row("share a pool", -fewer * buy, words + "needs like ratings and standards, and an agreement", 0.0))
    stands = shortage_of(one, prices, today)
    without = shortage_of(one, prices, then)
    years = float(one.periods[-1]) / 365.25
    words = (
        "what the shortages that it would spare cost: aircraft stand, then engines are rented; present value, a year"
    )
    rows.append(row("go short", (stands - without) / years, words, 0.0))
    return rows


def shortage_of(one: Model, prices: Money, choice: Holding) -> float:
    """Return the present cost of a holding's shortages."""
    return cost_of(one, prices, choice).short_usd


def pooled_saving(one: Model, today: Holding, target: float) -> float:
    """Return how many engines fewer each of two like fleets needs for a cover if they share their spares."""
    alone = engines_for(one, today, target)
    taken = None if one.engine.taken is None else 2 * one.engine.taken
    both = one._replace(engine=replace(one.engine, means=2.0 * one.engine.means, taken=taken))
    together = engines_for(both, today._replace(added_mean=2.0 * today.added_mean), target)
    return 0.0 if alone is None or together is None else max(0, 2 * alone - together) / 2.0


def places(view: Picture, one: Model, *, most: int) -> list[Row]:
    """Return the rows of holdings_places: where to hold 0 … ``most`` engines, the base with most positions as depot.

    Ways are those of routes from the depot; a base without a route is at hand at once.
    """
    bases = _bases(view, one)
    if not bases:
        return []
    days = float(one.engine.means.mean()) / one.per_day if one.per_day else 0.0
    rows = []
    for place in best_places(bases, repair_days=days, total=most):
        for number, base in enumerate(bases):
            rows.append(
                {
                    "engine_type": one.kind.engine_type,
                    "engines": place.total,
                    "base": base.name,
                    "count": place.at_base[number] + (place.depot if number == 0 else 0),
                    "engines_short_mean": place.short_mean,
                }
            )
    return rows


def _bases(view: Picture, one: Model) -> list[Base]:
    """Return the bases of a type, the depot first, with their share of removals and their way from the depot."""
    positions = Counter[str]()
    for aircraft in view.fleet.aircraft:
        if aircraft.engine_type == one.kind.engine_type:
            positions[aircraft.base] += aircraft.positions
    total = sum(positions.values())
    ordered = sorted(positions, key=lambda base: (-positions[base], base))
    return [Base(base, one.per_day * positions[base] / total, _way_days(view, ordered[0], base)) for base in ordered]


def _way_days(view: Picture, depot: str, base: str) -> float:
    if base == depot:
        return 0.0
    found: Sequence[float] = [r.days for r in view.fleet.routes if {r.from_place, r.to_place} == {depot, base}]
    return min(found, default=0.0)
