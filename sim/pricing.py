"""What a piece of work costs, as values: one catalogue of priced items for strategies and ledger alike.

An *item* is something that can be counted in events (a restoration of an HPT in a shop, a day of an aircraft lost, a
kilogram of fuel). Events name an item and an amount, never money; strategies read expected prices from the same
catalogue, so that decision and account cannot disagree.
"""

from __future__ import annotations

from typing import NamedTuple

from sim.fleet import Fleet

LINES = (
    "work",
    "findings",
    "parts",
    "access",
    "engine_level",
    "test",
    "transport",
    "engine_change",
    "exchange",
    "call_out",
    "lease_in",
    "spare_keeping",
    "downtime",
    "wash",
    "wear_fuel",
    "wear_co2",
    "reserves_paid",
    "reserves_drawn",
    "return_settlement",
    "late_credit",
    "stock_start",
    "stock_end",
    "life_start",
    "life_end",
)
VALUE_LINES = ("stock_start", "stock_end", "life_start", "life_end")
DAYS_PER_MONTH = 365.25 / 12.0
INDEX_NAMES = ("parts", "material", "repair", "labour", "rent", "test", "transport", "out_of_service", "fuel")


class Item(NamedTuple):
    """One priced thing: its line, engine type, price in USD a unit at the price date, and shares by index."""

    key: tuple[str, ...]
    line: str
    engine_type: str
    price_usd: float
    shares: tuple[tuple[str, float], ...]


class Catalogue:
    """Every priced item of a fleet, by key and by number. ``number(...)`` of an unknown key adds an unpriced item
    (price NaN), which the ledger turns into an error when the event really happens."""

    __slots__ = ("_numbers", "items")

    def __init__(self, items: tuple[Item, ...]) -> None:
        self.items = list(items)
        self._numbers = {item.key: i for i, item in enumerate(items)}

    def number(self, *key: str) -> int:
        found = self._numbers.get(key)
        if found is None:
            found = self._numbers[key] = len(self.items)
            self.items.append(Item(key, "work", "", float("nan"), ()))
        return found

    def price(self, number: int) -> float:
        """Return the price in USD a unit at the price date."""
        return self.items[number].price_usd


def catalogue(fleet: Fleet) -> Catalogue:
    """Return the catalogue of a fleet."""
    return Catalogue((*_work(fleet), *_moves(fleet), *_operation(fleet), *_values(fleet), *_contracts(fleet)))


def _work(fleet: Fleet) -> list[Item]:
    items = []
    for shop in fleet.shops:
        visit_factors = {
            w.visit: w.price_factor
            for w in fleet.shop_work
            if w.shop == shop.shop and w.engine_type == shop.engine_type
        }
        for work in fleet.work:
            if work.engine_type != shop.engine_type:
                continue
            shares = (("material", work.material_frac), ("repair", work.repair_frac), ("labour", work.labour_frac))
            name = (work.engine_type, work.module, work.level, shop.shop)
            price = work.cost_usd * shop.price_factor
            items.append(Item(("work", *name), "work", work.engine_type, price, shares))
            items.append(Item(("findings", *name), "findings", work.engine_type, price, shares))
            items.append(
                Item(
                    ("access", *name),
                    "access",
                    work.engine_type,
                    work.access_usd * shop.price_factor,
                    (("labour", 1.0),),
                )
            )
        for visit in fleet.visits:
            if visit.engine_type != shop.engine_type:
                continue
            factor = shop.price_factor * visit_factors.get(visit.visit, 1.0)
            kind_of_visit = (visit.engine_type, visit.visit, shop.shop)
            level = visit.engine_level_usd * factor
            items.append(
                Item(("engine_level", *kind_of_visit), "engine_level", visit.engine_type, level, (("labour", 1.0),))
            )
            items.append(Item(("test", *kind_of_visit), "test", visit.engine_type, visit.test_usd, (("test", 1.0),)))
    for part in fleet.part_types:
        items.append(Item(("part", part.part_number), "parts", part.engine_type, part.price_usd, ((part.index, 1.0),)))
    return items


def _moves(fleet: Fleet) -> list[Item]:
    items = []
    for shop in fleet.shops:
        for what, price in (("engine", shop.engine_transport_usd), ("module", shop.module_transport_usd)):
            key: tuple[str, ...] = ("transport", what, shop.engine_type, shop.shop)
            items.append(Item(key, "transport", shop.engine_type, price, (("transport", 1.0),)))
        key = ("late", shop.engine_type, shop.shop)
        items.append(Item(key, "late_credit", shop.engine_type, -shop.late_usd_per_day, ()))
    for route in fleet.routes:
        for what, price in (("engine", route.engine_usd), ("module", route.module_usd)):
            key = ("route", what, route.from_place, route.to_place)
            items.append(Item(key, "transport", "", price, (("transport", 1.0),)))
    for module in fleet.module_types:
        key = ("exchange", module.engine_type, module.module)
        items.append(Item(key, "exchange", module.engine_type, module.exchange_usd, (("labour", 1.0),)))
    for team in fleet.teams:
        for engine_type in fleet.engine_types:
            key = ("call_out", team.team, engine_type.engine_type)
            items.append(Item(key, "call_out", engine_type.engine_type, team.call_out_usd, (("labour", 1.0),)))
    return items


def _operation(fleet: Fleet) -> list[Item]:
    settings = fleet.settings
    items = []
    for kind in fleet.engine_types:
        name = kind.engine_type
        items += [
            Item(("engine_change", name), "engine_change", name, kind.engine_change_usd, (("labour", 1.0),)),
            Item(("downtime", name), "downtime", name, kind.out_of_service_usd_per_day, (("out_of_service", 1.0),)),
            Item(("fuel", name), "wear_fuel", name, settings.fuel_price_usd_per_kg, (("fuel", 1.0),)),
            Item(
                ("co2", name),
                "wear_co2",
                name,
                settings.co2_kg_per_kg_fuel * settings.co2_price_usd_per_kg,
                (("fuel", 1.0),),
            ),
            Item(
                ("keeping", name, "engine"),
                "spare_keeping",
                name,
                kind.spare_price_usd * settings.spare_keeping_frac_per_year / 365.25,
                (("material", 1.0),),
            ),
        ]
    for module in fleet.module_types:
        daily = module.spare_price_usd * settings.spare_keeping_frac_per_year / 365.25
        key: tuple[str, ...] = ("keeping", module.engine_type, module.module)
        items.append(Item(key, "spare_keeping", module.engine_type, daily, (("material", 1.0),)))
    for wash in fleet.washes:
        key = ("wash", wash.engine_type, wash.base)
        items.append(Item(key, "wash", wash.engine_type, wash.cost_usd, (("labour", 1.0),)))
    for market in fleet.lease_market:
        name = market.engine_type
        for unit, price in (
            ("day", market.usd_per_month / DAYS_PER_MONTH),
            ("hour", market.usd_per_hour),
            ("cycle", market.usd_per_cycle),
            ("delivery", market.deliver_usd),
        ):
            items.append(Item(("lease_in", name, unit), "lease_in", name, price, (("rent", 1.0),)))
    return items


def _values(fleet: Fleet) -> list[Item]:
    """Life left and stock, at the two ends of the study; bought and sold, never escalated inside a line."""
    items = []
    for end in ("start", "end"):
        sign = 1.0 if end == "start" else -1.0
        for part in fleet.part_types:
            key: tuple[str, ...] = ("life", end, part.part_number)
            items.append(Item(key, f"life_{end}", part.engine_type, sign * part.price_usd, ((part.index, 1.0),)))
        for work in fleet.work:
            if work.level != "restoration":
                continue
            shares = (("material", work.material_frac), ("repair", work.repair_frac), ("labour", work.labour_frac))
            key = ("life", end, work.engine_type, work.module)
            items.append(Item(key, f"life_{end}", work.engine_type, sign * work.cost_usd, shares))
        for kind in fleet.engine_types:
            frames = sum(m.spare_price_usd for m in fleet.module_types if m.engine_type == kind.engine_type)
            key = ("stock", end, kind.engine_type, "engine")
            items.append(Item(key, f"stock_{end}", kind.engine_type, sign * frames, (("material", 1.0),)))
        for module in fleet.module_types:
            key = ("stock", end, module.engine_type, module.module)
            price = sign * module.spare_price_usd
            items.append(Item(key, f"stock_{end}", module.engine_type, price, (("material", 1.0),)))
    return items


def _contracts(fleet: Fleet) -> list[Item]:
    """Return settlements and reserves; their own escalation is applied to the amount (see sim/returns.py)."""
    items = []
    for rule in fleet.lease_settlements:
        price = rule.event_cost_usd if rule.basis in ("half_life", "full_life", "hard") else rule.rate_usd
        key: tuple[str, ...] = ("settlement", rule.terms, rule.engine_type, rule.event, rule.basis)
        items.append(Item(key, "return_settlement", rule.engine_type, price, ()))
    for term in fleet.lease_terms:
        key = ("short", term.terms, term.engine_type, term.condition)
        items.append(Item(key, "return_settlement", term.engine_type, term.usd_per_unit_short, ()))
    for account in fleet.reserve_accounts:
        for unit, price in (("hour", account.usd_per_hour), ("cycle", account.usd_per_cycle)):
            key = ("reserve", account.lease, account.event, unit)
            items.append(Item(key, "reserves_paid", "", price, ()))
    return items
