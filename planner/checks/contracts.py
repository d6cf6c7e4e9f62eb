"""Rules on owners, leases and what is agreed; and on aircraft that have more than one weak spot."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

from planner.checks.facts import Facts
from planner.checks.fault import Fault, Rule, did_you_mean, stops, warns

_TOGETHER_DAYS = 60  # removals of one aircraft's engines within this many days send both away together

_OPERATOR = "the operator"  # a blank owner


def leases_name_one_aircraft_or_engine(facts: Facts) -> Iterator[Fault]:
    for row, lease, tail, engine in facts.records["leases"].pick("lease", "tail", "engine_serial"):
        if bool(tail) == bool(engine):
            found = "both" if tail else "neither"
            message = f"lease {lease} names {found} of tail and engine; name the one that is leased"
            yield Fault("leases", row, "tail", found, "a tail or an engine", message)


def leases_have_terms(facts: Facts) -> Iterator[Fault]:
    if not facts.records.given("lease_terms") and not facts.records.given("lease_settlements"):
        return
    known = {*facts.records["lease_terms"]["terms"], *facts.records["lease_settlements"]["terms"]} - {None}
    for row, lease, terms in facts.records["leases"].pick("lease", "terms"):
        if terms and terms not in known:
            message = f"the terms {terms} of lease {lease} are not described; taken as without conditions"
            yield Fault("leases", row, "terms", terms, "terms of lease_terms", message + did_you_mean(terms, known))


def conditions_have_a_bound(facts: Facts) -> Iterator[Fault]:
    measured = ("part_cycles", "hours_since_restoration", "cycles_since_restoration", "margin", "cycles_to_removal")
    names = ("terms", "condition", "least", "most")
    for row, terms, condition, least, most in facts.records["lease_terms"].pick(*names):
        if condition not in measured:
            continue
        if least is None and most is None:
            message = f"condition {condition} of terms {terms} has neither least nor most; fill one"
            yield Fault("lease_terms", row, "least", "blank", "least or most", message)
        elif least is not None and most is not None and least > most:
            message = (
                f"condition {condition} of terms {terms} asks for at least {least:g} and at most {most:g}; mend one"
            )
            yield Fault("lease_terms", row, "most", f"{most:g}", f"at least {least:g}", message)


def lease_returns_lie_ahead(facts: Facts) -> Iterator[Fault]:
    for row, lease, date in facts.records["leases"].pick("lease", "return_date"):
        if date and date < facts.as_of:
            message = f"lease {lease} was due back on {date}; taken as due on the as-of date"
            yield Fault("leases", row, "return_date", str(date), f"{facts.as_of} or later", message)


def leased_aircraft_belong_to_their_lessor(facts: Facts) -> Iterator[Fault]:
    for row, lease, name, owner in facts.records["leases"].pick("lease", "tail", "owner"):
        tail = facts.tails.get(name or "")
        if tail and owner and tail.owner and tail.owner != owner:
            message = f"lease {lease} has {owner} as lessor of {name}, aircraft has {tail.owner}; the lease is used"
            yield Fault("leases", row, "owner", owner, tail.owner, message)


def modules_fly_on_engines_of_their_owner(facts: Facts) -> Iterator[Fault]:
    for serial, module in facts.modules.items():
        engine = facts.engines.get(module.engine_serial or "")
        if engine and module.owner != engine.owner and None not in (module.owner, engine.owner):
            whose, other = module.owner or _OPERATOR, engine.owner or _OPERATOR
            message = f"{serial} of {whose} is in engine {module.engine_serial} of {other}; it must go back"
            yield Fault("modules", module.row, "owner", module.owner, other, message)


def parts_fly_in_modules_of_their_owner(facts: Facts) -> Iterator[Fault]:
    for row, serial, module_serial, owner in facts.records["parts"].pick("part_serial", "module_serial", "owner"):
        module = facts.modules.get(module_serial or "")
        if module and owner != module.owner and None not in (owner, module.owner):
            whose, other = owner or _OPERATOR, module.owner or _OPERATOR
            message = f"{serial} of {whose} is in module {module_serial} of {other}; it must go back"
            yield Fault("parts", row, "owner", owner, other, message)


def bought_ratings_say_what_follows(facts: Facts) -> Iterator[Fault]:
    for row, tail, until, after in facts.records["aircraft"].pick("tail", "rating_until", "rating_after"):
        if (
            bool(until) != bool(after)
            and not {(row, "rating_until"), (row, "rating_after")} & facts.records["aircraft"].faulty
        ):
            found = f"until {until}" if until else f"after: {after}"
            message = f"{tail} has a rating {found} but not the other of the two; fill both or neither"
            yield Fault("aircraft", row, "rating_after", found, "both or neither", message)


def ratings_do_not_expire(facts: Facts) -> Iterator[Fault]:
    for row, tail, rating, until, after in facts.records["aircraft"].pick(
        "tail", "rating", "rating_until", "rating_after"
    ):
        if until and after and until >= facts.as_of:
            message = f"the rating {rating} of {tail} ends on {until}; life is counted at {after} from that day"
            yield Fault("aircraft", row, "rating_until", str(until), "a rating that stays", message)


def _weak(facts: Facts) -> dict[str, list[str]]:
    """Return why each engine on a wing is weak: little life on a part, or little margin."""
    left: dict[str, tuple[int, str]] = {}
    for part in facts.parts:
        module = facts.modules.get(part.module_serial)
        if module and module.engine_serial and part.limit is not None:
            known = left.get(module.engine_serial)
            if known is None or part.left < known[0]:
                left[module.engine_serial] = part.left, part.serial
    margins = margins_now(facts)
    weak: dict[str, list[str]] = {}
    for serial, engine in facts.engines.items():
        if engine.place not in ("wing", "leased_in") or not engine.tail:
            continue
        reasons = []
        if serial in left and left[serial][0] < facts.setting("weak_cycles"):
            reasons.append(f"{left[serial][0]:,} cycles left on {left[serial][1]}")
        if serial in margins and margins[serial] < facts.setting("weak_margin_degC"):
            reasons.append(f"margin {margins[serial]:.1f} degC")
        if reasons:
            weak[serial] = reasons
    return weak


def margins_now(facts: Facts) -> dict[str, float]:
    """Return the hot-day margin of each engine on a wing whose modules all give what they have lost, degC."""
    new: dict[tuple[str, str], float] = {}
    for _, kind, rating, margin in facts.records["ratings"].pick("engine_type", "rating", "new_margin_degC"):
        if margin is not None:
            new[kind, rating] = margin
    lost: dict[str, list[float | None]] = {}
    for _, engine, loss in facts.records["modules"].pick("engine_serial", "margin_lost_degC"):
        if engine:
            lost.setdefault(engine, []).append(loss)
    found: dict[str, float] = {}
    for serial, engine in facts.engines.items():
        tail = facts.tails.get(engine.tail or "")
        losses = lost.get(serial, [])
        known = [loss for loss in losses if loss is not None]
        if tail and known and (engine.engine_type, tail.rating) in new:
            # a module without wear of its own (a gearbox) may be blank
            found[serial] = new[engine.engine_type, tail.rating] - sum(known)
    return found


def aircraft_have_at_most_one_weak_engine(facts: Facts) -> Iterator[Fault]:
    weak = _weak(facts)
    by_tail: dict[str, list[str]] = {}
    for serial in weak:
        by_tail.setdefault(facts.engines[serial].tail, []).append(serial)
    for tail, serials in by_tail.items():
        fact = facts.tails.get(tail)
        if fact and len(serials) > 1:
            reasons = "; ".join(f"{serial}: {', '.join(weak[serial])}" for serial in serials)
            etops = f", ETOPS {fact.etops_minutes} min" if fact.etops_minutes else ""
            message = f"{tail}{etops} has {len(serials)} weak engines ({reasons}); a cost, not a ban: spread them"
            yield Fault("aircraft", fact.row, "tail", ", ".join(serials), "at most one weak engine", message)


def leased_aircraft_have_no_engine_weak_in_life_and_margin(facts: Facts) -> Iterator[Fault]:
    leased = {tail for tail in facts.records["leases"]["tail"] if tail}
    for serial, reasons in _weak(facts).items():
        engine = facts.engines[serial]
        if engine.tail in leased and len(reasons) > 1:
            message = f"{serial} on leased {engine.tail} is weak in both ({', '.join(reasons)}); plan its removal now"
            yield Fault("engines", engine.row, "engine_serial", ", ".join(reasons), "life or margin", message)


def agreed_removals_leave_an_engine_on_each_tail(facts: Facts) -> Iterator[Fault]:
    dates: dict[str, list[tuple[int, int, str]]] = {}
    for row, date, what, serials in facts.records["agreed"].pick("date", "what", "serials"):
        if not date or what not in ("removal", "slot", "swap"):
            continue
        for serial in serials or ():
            engine = facts.engines.get(serial)
            if engine and engine.tail and engine.place in ("wing", "leased_in"):
                dates.setdefault(engine.tail, []).append((date.toordinal(), row, serial))
    for tail, plans in dates.items():
        plans.sort()
        for (first, _, one), (later, row, other) in pairwise(plans):
            if one != other and later - first <= _TOGETHER_DAYS:
                fact = facts.tails.get(tail)
                etops = f" (ETOPS {fact.etops_minutes} min)" if fact and fact.etops_minutes else ""
                message = (
                    f"{one} and {other} of {tail}{etops} are agreed to go within {later - first} days; part the two"
                )
                yield Fault("agreed", row, "serials", f"{one} {other}", "one engine of a tail at a time", message)


def agreed_serials_are_known(facts: Facts) -> Iterator[Fault]:
    known = {*facts.engines, *facts.modules, *facts.tails, *facts.records["shops"]["shop"]}
    known |= {serial for serial in facts.records["parts"]["part_serial"] if serial}
    for row, serials in facts.records["agreed"].pick("serials"):
        for serial in serials or ():
            if serial not in known:
                message = f"{serial} is no engine, module, part, tail or shop; the agreement is left out"
                yield Fault("agreed", row, "serials", serial, "a serial of the fleet", message)


def findings_name_a_serial_of_the_fleet(facts: Facts) -> Iterator[Fault]:
    known: set[str] = {*facts.engines, *facts.modules}
    for row, serial in facts.records["watch"].pick("serial"):
        if serial and serial not in known:
            message = (
                f"{serial} is no engine or module; a finding that limits must be found "
                f"again{did_you_mean(serial, known)}"
            )
            yield Fault("watch", row, "serial", serial, "an engine or module", message)


def changes_of_use_name_a_tail(facts: Facts) -> Iterator[Fault]:
    known = {*facts.tails, *facts.records["aircraft"]["sub_fleet"]} - {None, ""}
    for row, tail in facts.records["utilisation"].pick("tail"):
        if tail and tail not in known:
            message = f"{tail} is no tail or sub-fleet; the change is left out{did_you_mean(tail, known)}"
            yield Fault("utilisation", row, "tail", tail, "a tail or sub-fleet", message)


def returns_within_a_year_leave_the_cycles_that_terms_ask(facts: Facts) -> Iterator[Fault]:
    """Cycles left on each part at the return at planned use, by today's limits and without a visit before."""
    least: dict[tuple[str, str], float] = {}
    names = ("terms", "engine_type", "condition", "least")
    for _, terms, kind, condition, value in facts.records["lease_terms"].pick(*names):
        if condition == "part_cycles" and value is not None:
            least[terms, kind] = value
    use = dict(zip(facts.records["aircraft"]["tail"], facts.records["aircraft"]["cycles_per_year"], strict=True))
    on_tail: dict[str, list[tuple[int, str]]] = {}
    for part in facts.parts:
        module = facts.modules.get(part.module_serial)
        engine = facts.engines.get(module.engine_serial) if module else None
        if engine and engine.place == "wing" and engine.tail:
            on_tail.setdefault(engine.tail, []).append((part.left, part.serial))
    for row, lease, tail, terms, date in facts.records["leases"].pick("lease", "tail", "terms", "return_date"):
        fact, cycles = facts.tails.get(tail or ""), use.get(tail)
        if not fact or not date or cycles is None or not 0 <= (date - facts.as_of).days <= 365:
            continue
        wanted = least.get((terms, fact.engine_type))
        flown = cycles * (date - facts.as_of).days / 365.25
        short = [(left - flown, serial) for left, serial in on_tail.get(tail, ()) if wanted and left - flown < wanted]
        if short:
            worst, serial = min(short)
            message = (
                f"lease {lease}: {len(short)} part(s) of {tail} will have less than "
                f"{wanted:,.0f} cycles on {date}, the "
                f"least {serial} with about {max(0, worst):,.0f}; see spoolwright lease for cures"
            )
            yield Fault("leases", row, "return_date", f"{max(0, worst):,.0f}", f"at least {wanted:,.0f}", message)


CONTRACT_RULES: tuple[Rule, ...] = (
    stops(leases_name_one_aircraft_or_engine),
    warns(leases_have_terms),
    stops(conditions_have_a_bound),
    warns(lease_returns_lie_ahead),
    warns(leased_aircraft_belong_to_their_lessor),
    warns(modules_fly_on_engines_of_their_owner),
    warns(parts_fly_in_modules_of_their_owner),
    stops(bought_ratings_say_what_follows),
    warns(ratings_do_not_expire),
    warns(aircraft_have_at_most_one_weak_engine),
    warns(leased_aircraft_have_no_engine_weak_in_life_and_margin),
    warns(returns_within_a_year_leave_the_cycles_that_terms_ask),
    warns(agreed_removals_leave_an_engine_on_each_tail),
    warns(agreed_serials_are_known),
    stops(findings_name_a_serial_of_the_fleet),
    warns(changes_of_use_name_a_tail),
)
