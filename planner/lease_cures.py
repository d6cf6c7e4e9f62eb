"""Ways through one engine's lease return, each costed over the simulated runs: what is spent, then settled, then kept.

A cure's cost is its work and the worth of what is given away, less the money that the return then pays, in present
value and on average over the runs; its chance of passing is the share of runs in which every condition holds.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import NamedTuple

from planner import settlement
from planner.after_work import after_exchange, after_visit
from planner.lease_outcome import Outcome, failing_work, opening_usd, outcome
from planner.lease_runs import Returned
from planner.picture import DAYS_PER_YEAR, Picture
from sim.fleet import Engine, Lease
from sim.spec import CHECK, LEVELS, NONE, RESTORATION
from sim.state import EngineState, ModuleState
from sim.valuation import module_fraction
from sim.view import Scope


class Cure(NamedTuple):
    """One way through a return for one engine. ``uses`` are serials that it takes, each only once over all returns.

    ``allowed`` is false when the plan may not choose it; ``reason`` says why, or what it does.
    """

    lease: str
    engine_serial: str
    cure: str
    uses: tuple[str, ...]
    cost_usd: float
    pass_chance: float
    lead_days: float
    last_day: float
    risk: str
    reason: str
    allowed: bool = True


def fly_out(view: Picture, lease: Lease, row: Engine, runs: Sequence[Returned], away: tuple[str, ...]) -> Cure:
    """Return the cure that does nothing: fly to the return and pay what it asks for."""
    outcomes = [outcome(view, lease, one.engines[row.engine_serial], rating=one.rating, away=away) for one in runs]
    risk = "a hard condition that fails asks for the visit after all, at the lessor's time"
    return _cure(
        view, lease, row, "fly out and pay", (), [0.0] * len(runs), outcomes, lead=0.0, risk=risk,
        reason="pays short units and settlement; a hard failure counts at the price of its cure",
    )  # fmt: skip


def visit_before(
    view: Picture, lease: Lease, row: Engine, runs: Sequence[Returned], away: tuple[str, ...], *, parts_only: bool
) -> Cure:
    """Return a shop visit just before the return, with the least work that passes; where all passes nothing is done."""
    day = max(0.0, lease.return_day)
    spent, outcomes = [], []
    for one in runs:
        engine = one.engines[row.engine_serial]
        levels, replace = failing_work(view, lease, engine, rating=one.rating, day=day)
        if parts_only:
            levels = tuple(NONE for _ in levels)
        levels = _with_access(engine, levels, replace)
        if not any(levels):
            spent.append(0.0)
            outcomes.append(outcome(view, lease, engine, rating=one.rating, away=away))
            continue
        scope = Scope("core", levels, replace)
        cash, reserve = _work_usd(view, lease, engine, scope, day=day)
        spent.append(cash - reserve)
        built = after_visit(view, engine, scope, rating=one.rating, day=day)
        outcomes.append(outcome(view, lease, built, rating=one.rating, away=away))
    name = "replace parts" if parts_only else "visit before"
    lead = _stay_days(view, row.engine_type)
    risk = "the turn time is long-tailed; a late release is a late return"
    reason = "the least work that makes every condition pass, reserves drawn"
    if parts_only:
        reason = "only the parts that miss the condition, with access and checks"
    return _cure(view, lease, row, name, (), spent, outcomes, lead=lead, risk=risk, reason=reason)


def swap_engine(
    view: Picture, lease: Lease, row: Engine, runs: Sequence[Returned], *, other: str, away: tuple[str, ...]
) -> Cure:
    """Return the cure that hands over another engine of the fleet and keeps this one."""
    day = max(0.0, lease.return_day)
    lessors = {one.owner for one in view.fleet.leases}
    spent, outcomes = [], []
    for one in runs:
        given, kept = one.engines.get(other), one.engines[row.engine_serial]
        if given is None or len(given.modules) != len(kept.modules):
            return _refused(lease, row, "swap an engine", (other,), f"{other} is not in the fleet at the return")
        moves = (2.0 if one.where.get(other) else 1.0) * view.price("engine_change", row.engine_type, day=day)
        worth = engine_usd(view, given, rating=one.rating, day=day) - engine_usd(view, kept, rating=one.rating, day=day)
        spent.append(moves + worth)
        outcomes.append(outcome(view, lease, given, rating=one.rating, away=()))
    owner = view.engine_rows[other].owner
    why = _title_reason(lease, owner, lessors)
    cure = _cure(
        view, lease, row, "swap an engine", (other,), spent, outcomes, lead=float(lease.approval_days),
        risk="the lessor may refuse; the engine kept changes its owner", reason=why or "title of both engines changes",
    )  # fmt: skip
    return cure._replace(allowed=not why)


def swap_module(
    view: Picture,
    lease: Lease,
    row: Engine,
    runs: Sequence[Returned],
    *,
    other: str,
    slot: int,
    away: tuple[str, ...],
    fits: Callable[[str, str, str], str],
) -> Cure:
    """Return the cure that exchanges one module by one of the pool. ``fits`` says why a module may not go on, or ''."""
    day = max(0.0, lease.return_day)
    lessors = {one.owner for one in view.fleet.leases}
    why = fits(other, row.engine_serial, lease.tail)
    if why:
        return _refused(lease, row, "swap a module", (other,), why)
    spent, outcomes = [], []
    for one in runs:
        engine, module = one.engines[row.engine_serial], one.modules.get(other)
        if module is None:
            return _refused(lease, row, "swap a module", (other,), f"{other} is not in the pool at the return")
        own = engine.modules[slot]
        worth = module_usd(view, module, rating=one.rating, day=day) - module_usd(view, own, rating=one.rating, day=day)
        spent.append(_exchange_usd(view, engine, slot, day=day) + worth)
        built = after_exchange(engine, {slot: module})
        outcomes.append(outcome(view, lease, built, rating=one.rating, away=away))
    owner = next((m.owner for m in view.fleet.modules if m.module_serial == other), "")
    why = _title_reason(lease, owner, lessors)
    spec = next(iter(runs)).engines[row.engine_serial].spec.modules[slot]
    lead = lease.approval_days + (spec.exchange_days if spec.place != "shop" else _stay_days(view, row.engine_type))
    cure = _cure(
        view, lease, row, "swap a module", (other,), spent, outcomes, lead=float(lead),
        risk="the lessor may refuse; the module may be needed before", reason=why or f"its {spec.module} goes along",
    )  # fmt: skip
    return cure._replace(allowed=not why)


def extend(view: Picture, lease: Lease, row: Engine, base: Cure) -> Cure:
    """Return the extension of the lease: the settlement is put off by its years; rent is not in the tables."""
    years = lease.extend_years
    later = base.cost_usd * view.discount(years * DAYS_PER_YEAR)
    agreed = lease.after_return == "extend"
    reason = f"puts the same return off by {years:g} years; rent and terms of the extension are not counted"
    if not agreed:
        reason += "; no extension is agreed (after_return)"
    return Cure(
        lease.lease, row.engine_serial, "extend", (), later, base.pass_chance, 0.0, max(0.0, lease.return_day),
        "the lessor must agree", reason, agreed,
    )  # fmt: skip


def engine_usd(view: Picture, engine: EngineState, *, rating: int, day: float) -> float:
    """Return the value of life that an engine holds: parts by their share of price, modules of a restoration."""
    return sum(module_usd(view, module, rating=rating, day=day) for module in engine.modules)


def module_usd(view: Picture, module: ModuleState, *, rating: int, day: float) -> float:
    """Return the value of life that one module holds with its parts."""
    spec = module.spec
    usd = module_fraction(module) * view.price("life", "start", spec.engine_type, spec.module, day=day)
    for part in module.parts:
        left = part.fraction_left(module.run, rating, day) if part.known else 0.0
        usd += left * view.price("part", part.spec.part_number, day=day)
    return usd


def _cure(
    view: Picture,
    lease: Lease,
    row: Engine,
    name: str,
    uses: tuple[str, ...],
    spent: list[float],
    outcomes: list[Outcome],
    *,
    lead: float,
    risk: str,
    reason: str,
) -> Cure:
    worth = view.discount(max(0.0, lease.return_day))
    cost = sum(s - o.usd for s, o in zip(spent, outcomes, strict=True)) / max(1, len(outcomes)) * worth
    chance = sum(o.passes for o in outcomes) / max(1, len(outcomes))
    last = lease.return_day - lead
    late = last < 0.0 and name != "fly out and pay"
    if late:
        reason = f"too late: it takes {lead:.0f} days and the return is in {lease.return_day:.0f}; {reason}"
    return Cure(lease.lease, row.engine_serial, name, uses, cost, chance, lead, last, risk, reason, not late)


def _refused(lease: Lease, row: Engine, name: str, uses: tuple[str, ...], why: str) -> Cure:
    return Cure(
        lease.lease, row.engine_serial, name, uses, float("nan"), 0.0, 0.0, max(0.0, lease.return_day), "", why, False
    )


def _title_reason(lease: Lease, owner: str, lessors: set[str]) -> str:
    """Return why the lease lets no other serial go back in place of its own, or an empty string."""
    if owner and owner in lessors and owner != lease.owner:
        return f"belongs to {owner}, another lessor"
    if lease.exchange_rule == "title_swap":
        return ""
    wants = "no exchange" if lease.exchange_rule == "never" else "its own serials back"
    return f"the lease of {lease.owner} asks for {wants}; it would need the lessor's approval of a title swap"


def _with_access(engine: EngineState, levels: tuple[int, ...], replace: tuple[tuple[int, ...], ...]) -> tuple[int, ...]:
    """Return the levels with everything exposed that must be opened, at a check."""
    opened = list(levels)
    for slot, numbers in enumerate(replace):
        if numbers:
            opened[slot] = max(opened[slot], CHECK)
    for slot, level in enumerate(list(opened)):
        if level:
            for front in engine.spec.modules[slot].behind:
                opened[front] = max(opened[front], CHECK)
    return tuple(opened)


def _work_usd(view: Picture, lease: Lease, engine: EngineState, scope: Scope, *, day: float) -> tuple[float, float]:
    """Return cash of a visit's work and what the lease's reserves give towards it."""
    kind, price = engine.spec.engine_type, view.price
    shop = view.setup.shops[kind][0].shop
    by_event: dict[str, float] = {}
    checks = 0.0
    for module in engine.modules:
        level = scope.levels[module.spec.slot]
        if level:
            name = (kind, module.spec.module, LEVELS[level], shop)
            usd = price("work", *name, day=day) + price("access", *name, day=day)
            if level >= RESTORATION:
                by_event[module.spec.module] = by_event.get(module.spec.module, 0.0) + usd
            else:
                checks += usd
        for number in scope.replace[module.spec.slot]:
            usd = price("part", module.parts[number].spec.part_number, day=day)
            by_event["parts"] = by_event.get("parts", 0.0) + usd
    drawn = 0.0
    for account in view.fleet.reserve_accounts:
        if account.lease != lease.lease:
            continue
        use = view.uses.get(lease.tail)
        hours = use.hours(use.cycles(day)) if use else 0.0
        cycles = use.cycles(day) if use else 0.0
        daily = (hours * account.usd_per_hour + cycles * account.usd_per_cycle) / max(day, 1.0)
        balance = settlement.reserve_balance(
            account.balance_usd, usd_per_day=daily, days=day, escalation_frac=account.escalation_frac
        )
        qualifying = sum(by_event.values()) if account.event == "engine" else by_event.get(account.event, 0.0)
        drawn += settlement.reserves_drawn(balance, qualifying_usd=qualifying)
    return opening_usd(view, engine, day=day) + checks + sum(by_event.values()), drawn


def _exchange_usd(view: Picture, engine: EngineState, slot: int, *, day: float) -> float:
    kind, spec = engine.spec.engine_type, engine.spec.modules[slot]
    usd = view.price("exchange", kind, spec.module, day=day)
    if spec.place == "shop":
        usd += opening_usd(view, engine, day=day)
        shop = view.setup.shops[kind][0].shop
        for front in spec.behind:
            name = (kind, engine.spec.modules[front].module, "check", shop)
            usd += view.price("work", *name, day=day) + view.price("access", *name, day=day)
    return usd


def _stay_days(view: Picture, kind: str) -> float:
    days = [
        2.0 * s.transport_days + (s.turn["core"].mean_days if "core" in s.turn else 0.0) for s in view.setup.shops[kind]
    ]
    return min(days, default=0.0)
