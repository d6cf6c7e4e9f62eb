"""No strategy sees the future: what it is shown holds no drawn value, and hidden values do not move its answer."""

from __future__ import annotations

from dataclasses import replace

import pytest
from builders import exponential_removals, tiny_fleet

from sim.fleet import Module, Part, WearRow
from sim.removal import Removal
from sim.setting_out import set_out
from sim.spec import setup
from sim.start import names
from sim.strategy import decide
from sim.view import ModuleView, PartView, ShopView, View
from sim.world import World


def test_the_view_has_these_fields_and_no_other() -> None:
    # a new field must be added here by hand, by someone who asks whether it is drawn
    assert View._fields == (
        "day",
        "spec",
        "engine_serial",
        "cause",
        "slot",
        "least_level",
        "modules",
        "margin_degC",
        "rating",
        "wear_factor",
        "hours_per_cycle",
        "cycles_per_year",
        "pool",
        "coming",
        "shops",
        "team_start_day",
        "spares",
        "waiting",
        "return_day",
    )
    assert ModuleView._fields == (
        "serial",
        "slot",
        "standard",
        "parts",
        "lost_degC",
        "permanent_degC",
        "cycles_since_restoration",
        "hours_since_restoration",
        "first_run",
    )
    assert PartView._fields == ("part_number", "left_cycles", "limit_cycles", "price_usd")
    assert ShopView._fields == ("shop", "transport_days", "engine_start_day", "module_start_day", "turn_days")


@pytest.mark.parametrize("strategy", ["whole_engine", "exchange", "cheapest"])
@pytest.mark.parametrize(("cause", "slot"), [("limit", 1), ("margin", -1), ("unscheduled", 0)])
def test_hidden_values_do_not_move_a_decision(strategy: str, cause: str, slot: int) -> None:
    fleet = exponential_removals(tiny_fleet(tails=3, spares=1), per_hour=1 / 500)
    wear = tuple(
        WearRow(
            engine_type="T",
            rating="one",
            module=m,
            early_loss_degC=5.0,
            loss_degC_per_1000_cycles=20.0,
            spread_frac=0.2,
        )
        for m in ("fan", "core")
    )
    pool = Module(module_serial="core-s", engine_type="T", module="core", place="pool")
    disk = Part(part_serial="core-disk-s", part_number="core-disk", module_serial="core-s", cycles_since_new=0)
    fleet = replace(fleet, wear=wear, modules=(*fleet.modules, pool), parts=(*fleet.parts, disk))
    ready = setup(fleet, strategy, horizon_days=100.0)
    answers = []
    for run in range(3):
        world = World(ready, names(ready), seed=11, run=run)
        set_out(world)
        for module in world.all_modules:  # drawn by the run, and pushed about on top
            module.budgets = [b * (run + 1) for b in module.budgets]
            module.early_at = 7 * run
            module.factor = 1.0 + 0.3 * run
        aircraft = world.aircraft[0]
        engine = aircraft.engines[0]
        assert engine is not None
        view = world.matching.view(aircraft, engine, Removal(0, cause, slot))
        answers.append((view, decide(view, ready.strategy["T"], world.catalogue)))
    assert answers[0] == answers[1] == answers[2]
