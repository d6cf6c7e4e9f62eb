"""Rules on what types, work, shops and prices must offer so that every removal can be worked and priced."""

from __future__ import annotations

from collections.abc import Iterator

from planner.checks.facts import Facts
from planner.checks.fault import Fault, Rule, stops, warns
from planner.schema.work_tables import LEVELS, VISITS

_ROUNDING_FRAC = 0.001


def work_has_every_level_of_every_module(facts: Facts) -> Iterator[Fault]:
    if not facts.told("work"):
        return
    rows = facts.records["work"]
    known = set(zip(rows["engine_type"], rows["module"], rows["level"], strict=True))
    for row, kind, module in facts.records["module_types"].pick("engine_type", "module"):
        missing = [level for level in LEVELS if (kind, module, level) not in known]
        if kind and module and missing:
            names = ", ".join(missing)
            message = f"work has no {names} of {module} of type {kind}; add the rows, work without a price is an error"
            yield Fault("module_types", row, "module", names, "a row of work for each level", message)


def shares_of_work_add_up_to_one(facts: Facts) -> Iterator[Fault]:
    names = ("module", "level", "material_frac", "repair_frac", "labour_frac")
    for row, module, level, *shares in facts.records["work"].pick(*names):
        if None not in shares and abs(sum(shares) - 1) > _ROUNDING_FRAC:
            message = f"shares of {level} of {module} add up to {sum(shares):.3f}; mend them, or the cost would change"
            yield Fault("work", row, "material_frac", f"{sum(shares):.3f}", "1", message)


def deeper_work_costs_more(facts: Facts) -> Iterator[Fault]:
    cost: dict[tuple[str, str, str], float] = {}
    rows: dict[tuple[str, str, str], int] = {}
    for row, kind, module, level, usd in facts.records["work"].pick("engine_type", "module", "level", "cost_usd"):
        if usd is not None and level:
            cost[kind, module, level], rows[kind, module, level] = usd, row
    for kind, module, level in cost:
        deeper = LEVELS[LEVELS.index(level) + 1 :][:1]
        for other in deeper:
            if cost.get((kind, module, other), cost[kind, module, level]) < cost[kind, module, level]:
                row, usd, less = rows[kind, module, other], cost[kind, module, other], cost[kind, module, level]
                message = f"{other} of {module} costs {usd:,.0f}, less than {level} at {less:,.0f}; used as it stands"
                yield Fault("work", row, "cost_usd", f"{usd:,.0f}", f"at least {less:,.0f}", message)


def visits_have_every_kind(facts: Facts) -> Iterator[Fault]:
    if not facts.told("visits"):
        return
    rows = facts.records["visits"]
    known = set(zip(rows["engine_type"], rows["visit"], strict=True))
    for row, kind in facts.records["engine_types"].pick("engine_type"):
        missing = [visit for visit in VISITS if (kind, visit) not in known]
        if kind and missing:
            names = ", ".join(missing)
            message = f"visits has no {names} of type {kind}; add the rows, a visit without a price is an error"
            yield Fault("engine_types", row, "engine_type", names, "a row of visits for each kind", message)


def every_type_has_a_shop(facts: Facts) -> Iterator[Fault]:
    if not facts.told("shops"):
        return
    known = set(facts.records["shops"]["engine_type"])
    for row, kind in facts.records["engine_types"].pick("engine_type"):
        if kind and kind not in known:
            message = f"no shop takes type {kind}; add a row to shops"
            yield Fault("engine_types", row, "engine_type", kind, "a shop", message)


def shops_have_a_turn_time_for_every_visit(facts: Facts) -> Iterator[Fault]:
    if not facts.told("shop_work"):
        return
    rows = facts.records["shop_work"]
    known = set(zip(rows["shop"], rows["engine_type"], rows["visit"], strict=True))
    for row, shop, kind in facts.records["shops"].pick("shop", "engine_type"):
        missing = [visit for visit in VISITS if (shop, kind, visit) not in known]
        if shop and kind and missing:
            names = ", ".join(missing)
            message = f"shop {shop} has no turn time for {names} of type {kind}; add the rows to shop_work"
            yield Fault("shops", row, "shop", names, "a row of shop_work for each kind of visit", message)


def every_type_has_ratings_modules_and_wear(facts: Facts) -> Iterator[Fault]:
    for row, kind in facts.records["engine_types"].pick("engine_type"):
        for table, what in (("ratings", "rating"), ("module_types", "module"), ("wear", "wear")):
            if kind and facts.told(table) and kind not in facts.records[table]["engine_type"]:
                message = f"type {kind} has no {what}; add rows to {table}"
                yield Fault("engine_types", row, "engine_type", kind, f"rows of {table}", message)


def ratings_that_fly_have_wear(facts: Facts) -> Iterator[Fault]:
    if not facts.told("wear"):
        return
    rows = facts.records["wear"]
    known = set(zip(rows["engine_type"], rows["rating"], strict=True))
    for tail, fact in facts.tails.items():
        if fact.engine_type and fact.rating and (fact.engine_type, fact.rating) not in known:
            message = f"{tail} flies at {fact.rating}, for which wear has no row; add them, no wear is not assumed"
            yield Fault("aircraft", fact.row, "rating", fact.rating, "rows of wear", message)


def hazards_can_be_drawn(facts: Facts) -> Iterator[Fault]:
    names = ("module", "cause", "scale", "probability_within", "ends_after_cycles")
    bad = {row for row, _ in facts.records["hazards"].faulty}
    for row, module, cause, scale, chance, ends in facts.records["hazards"].pick(*names):
        if row in bad:
            continue
        if cause == "early" and (chance is None or ends is None):
            message = f"early failure of {module} needs probability_within and ends_after_cycles; fill both"
            yield Fault("hazards", row, "probability_within", "blank", "a chance and the cycles it holds for", message)
        elif cause != "early" and scale is None:
            message = f"{cause} of {module} has no scale; fill it, or leave the row out"
            yield Fault("hazards", row, "scale", "blank", "a characteristic life", message)


def tails_of_turn_times_are_not_below_their_medians(facts: Facts) -> Iterator[Fault]:
    looked = (
        ("module_types", "module", "repair_days_median", "repair_days_p90"),
        ("shop_work", "visit", "days_median", "days_p90"),
    )
    for table, key, median_column, p90_column in looked:
        for row, name, median, p90 in facts.records[table].pick(key, median_column, p90_column):
            if median is not None and p90 is not None and p90 < median:
                message = f"{name}: the 90th percentile {p90:g} is below the median {median:g}; mend one of them"
                yield Fault(table, row, p90_column, f"{p90:g}", f"at least {median:g}", message)


def modules_stand_behind_modules_that_exist(facts: Facts) -> Iterator[Fault]:
    for row, kind, module, behind in facts.records["module_types"].pick("engine_type", "module", "behind"):
        for other in behind or ():
            if other not in facts.module_names.get(kind, ()) or other == module:
                message = f"{module} stands behind {other}, which is no other module of type {kind}; mend it"
                yield Fault("module_types", row, "behind", other, "modules of the type", message)


def no_module_stands_behind_itself(facts: Facts) -> Iterator[Fault]:
    """Access that runs in a circle would open nothing."""
    behind: dict[tuple[str, str], tuple[str, ...]] = {}
    numbers: dict[tuple[str, str], int] = {}
    for row, kind, module, others in facts.records["module_types"].pick("engine_type", "module", "behind"):
        behind[kind, module], numbers[kind, module] = tuple(others or ()), row
    for kind, module in behind:
        seen: set[str] = set()
        ahead = list(behind[kind, module])
        while ahead:
            other = ahead.pop()
            if other not in seen:
                seen.add(other)
                ahead += behind.get((kind, other), ())
        if module in seen and module not in behind[kind, module]:
            message = f"{module} stands behind itself by way of others; mend the access order"
            yield Fault("module_types", numbers[kind, module], "behind", module, "an order of access", message)


def every_month_has_its_share(facts: Facts) -> Iterator[Fault]:
    if not facts.told("season"):
        return
    shares = dict(zip(facts.records["season"]["month"], facts.records["season"]["share"], strict=True))
    missing = [month for month in range(1, 13) if month not in shares]
    if missing:
        names = ", ".join(map(str, missing))
        yield Fault("season", None, "month", names, "1 to 12", f"the months {names} are missing; add them")
    for row, month, share in facts.records["season"].pick("month", "share"):
        if share is not None and share <= 0:
            message = f"month {month} has no use; write a small share above zero, a fleet at rest has no calendar"
            yield Fault("season", row, "share", f"{share:g}", "above zero", message)


def shares_of_the_year_average_one(facts: Facts) -> Iterator[Fault]:
    shares = [share for share in facts.records["season"]["share"] if share is not None]
    if len(shares) == 12 and sum(shares) > 0 and abs(sum(shares) / 12 - 1) > 0.05:
        mean = f"{sum(shares) / 12:.3f}"
        message = f"the shares average {mean}, not 1; taken as proportions, the year's use stays as planned"
        yield Fault("season", None, "share", mean, "an average of 1", message)


def prices_are_in_dollars(facts: Facts) -> Iterator[Fault]:
    currency = facts.setting("currency")
    if currency and currency != "USD":
        row = next((row for row, name in facts.records["settings"].pick("name") if name == "currency"), None)
        message = f"the currency is {currency}, while every column is in USD; amounts are read as USD, convert them"
        yield Fault("settings", row, "value", currency, "USD", message)


def part_prices_are_of_one_order(facts: Facts) -> Iterator[Fault]:
    """A price far from its fellows is often in thousands or in another currency."""
    prices: dict[str, list[float]] = {}
    for _, kind, price in facts.records["part_types"].pick("engine_type", "price_usd"):
        if kind and price:
            prices.setdefault(kind, []).append(price)
    for row, number, kind, price in facts.records["part_types"].pick("part_number", "engine_type", "price_usd"):
        fellows = sorted(prices.get(kind, ()))
        if price is None or len(fellows) < 4:
            continue
        middle = fellows[len(fellows) // 2]
        if not middle / 25 <= price <= middle * 25:
            message = f"{number} costs {price:,.0f}, parts of type {kind} about {middle:,.0f}; used as it stands"
            yield Fault("part_types", row, "price_usd", f"{price:,.0f}", f"about {middle:,.0f}", message)


def parts_have_a_price(facts: Facts) -> Iterator[Fault]:
    for row, number, price in facts.records["part_types"].pick("part_number", "price_usd"):
        if price == 0:
            message = f"{number} costs nothing; a part without a price cannot be weighed against life, give its price"
            yield Fault("part_types", row, "price_usd", "0", "a list price", message)


CATALOGUE_RULES: tuple[Rule, ...] = (
    stops(work_has_every_level_of_every_module),
    stops(shares_of_work_add_up_to_one),
    warns(deeper_work_costs_more),
    stops(visits_have_every_kind),
    stops(every_type_has_a_shop),
    stops(shops_have_a_turn_time_for_every_visit),
    stops(every_type_has_ratings_modules_and_wear),
    stops(ratings_that_fly_have_wear),
    stops(hazards_can_be_drawn),
    stops(tails_of_turn_times_are_not_below_their_medians),
    stops(modules_stand_behind_modules_that_exist),
    stops(no_module_stands_behind_itself),
    stops(every_month_has_its_share),
    warns(shares_of_the_year_average_one),
    warns(prices_are_in_dollars),
    warns(part_prices_are_of_one_order),
    stops(parts_have_a_price),
)
