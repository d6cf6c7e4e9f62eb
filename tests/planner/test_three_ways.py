"""Three ways out: hand-worked lines, what an empty shelf takes away, the break-even checked on fleets of its own."""

import dataclasses

import pytest

from planner.off_wing import off_now
from planner.three_ways import three_ways
from planner.ways_out import costed_ways
from sim.errors import RequestError
from sim.fleet import Fleet, LeaseMarket, Module, Part
from tests.sim.builders import tiny_fleet


def with_spare_fan(*, core_used: int = 0, fan_used: int = 9_700, **changes: object) -> Fleet:
    """E1's fan has 300 cycles left; a fan with 5,000 left lies on the shelf; limits 10,000 each."""
    fleet = tiny_fleet(**changes)
    limits = tuple(dataclasses.replace(row, limit_cycles=10_000) for row in fleet.part_limits)
    used = {"fan-disk-1": fan_used, "core-disk-1": core_used}
    parts = tuple(
        dataclasses.replace(p, cycles_since_new=used[p.part_serial], flown=(("one", used[p.part_serial]),))
        if p.part_serial in used
        else p
        for p in fleet.parts
    )
    spare = Part(
        part_serial="fd9", part_number="fan-disk", module_serial="fan-9", cycles_since_new=5000, flown=(("one", 5000),)
    )
    strategies = tuple(dataclasses.replace(s, build_goal_cycles=6000, stub_cycles=1000) for s in fleet.strategies)
    return dataclasses.replace(
        fleet,
        part_limits=limits,
        parts=(*parts, spare),
        modules=(*fleet.modules, Module(module_serial="fan-9", engine_type="T", module="fan", place="pool")),
        strategies=strategies,
        lease_market=(LeaseMarket(engine_type="T", usd_per_month=30_437.5, chance=1.0, lead_days=10.0),),
    )


def lines_of(fleet: Fleet, way: str, shelf: str) -> dict[str, float]:
    ways = costed_ways(off_now(fleet, "E1"), shelf=shelf)
    best = min((one for one in ways if one.way == way), key=lambda one: one.cost_usd)
    found: dict[str, float] = {}
    for line in best.lines:
        found[line.line] = found.get(line.line, 0.0) + line.cost_usd
    return found


def test_the_whole_engine_is_worked_by_hand() -> None:
    """Out of 300 cycles: nothing is discounted or escalated; 10 days on the way, 20 in the shop.

    A quick visit (the fan stands in front of nothing): level 10,000, test 2,000, two moves at 1,500, change 10,000,
    fan opened and checked 1,000 + 5,000, a disk of 40,000 whose old one has nothing left, so all of it is life bought;
    a spare of 3,652,500 at 2 % a year for 30 days is 6,000.
    """
    lines = lines_of(with_spare_fan(), "A1", "full")
    later = lines.pop("later core visit")
    assert later >= 0
    assert lines == pytest.approx(
        {
            "engine change": 10_000,
            "transport": 3_000,
            "engine level": 10_000,
            "test": 2_000,
            "access": 1_000,
            "own repair": 5_000,
            "parts": 40_000,
            "life bought": -40_000,
            "spare tied up": 6_000,
        },
        abs=1.0,
    )


def test_the_exchange_is_worked_by_hand() -> None:
    """Three days near the wing: 600 of capital; the fan's own check and disk; its shelf is short for 40 days."""
    lines = lines_of(with_spare_fan(), "B", "full")
    lines.pop("later core visit")
    assert lines == pytest.approx(
        {
            "exchange": 3_000,
            "transport": 1_400,
            "own repair": 5_000,
            "parts": 40_000,
            "life bought": -40_000,
            "shelf": 500_000 * 0.02 * 40 / 365.25,
            "engine change": 10_000,
            "spare tied up": 600,
        },
        abs=1.0,
    )


def test_with_an_empty_shelf_the_exchange_waits_for_its_own_module() -> None:
    answer = three_ways(with_spare_fan(), "E1")
    assert answer.one("B", "full").days_without == pytest.approx(3.0)
    assert answer.one("B", "full").module_serial == "fan-9"
    assert answer.one("B", "empty").days_without == pytest.approx(5 + 30 + 5 + 3)
    assert answer.one("B", "empty").module_serial == ""
    assert "with an empty shelf" in answer.sentence


def test_an_aircraft_that_waits_long_leases_in_when_that_is_cheaper() -> None:
    dear = tuple(dataclasses.replace(t, out_of_service_usd_per_day=50_000.0) for t in tiny_fleet().engine_types)
    lines = lines_of(with_spare_fan(engine_types=dear), "A1", "empty")
    assert lines["aircraft down"] == pytest.approx(10 * 50_000)
    assert lines["lease in"] == pytest.approx(30 * 1_000)
    cheap = lines_of(with_spare_fan(), "A1", "empty")
    assert cheap["aircraft down"] == pytest.approx(30 * 1_000)
    assert "lease in" not in cheap


@pytest.mark.parametrize("core_used", [2_000, 5_000])
def test_break_even_of_core_life_is_where_the_ways_cross(core_used: int) -> None:
    """Fleets built with a core just above and just below the break-even confirm it, without the ageing in between."""
    even = three_ways(with_spare_fan(core_used=core_used), "E1").break_even
    assert even.core_left_cycles == 10_000 - 300 - core_used
    assert even.least_cycles is not None
    assert 100 < even.least_cycles < 9_000

    def saved(core_left: int) -> float:
        ways = costed_ways(off_now(with_spare_fan(core_used=10_000 - 300 - core_left), "E1"), shelf="full")
        return next(w.cost_usd for w in ways if w.way == "A2") - next(w.cost_usd for w in ways if w.way == "B")

    assert saved(even.least_cycles + 30) > 0
    assert saved(even.least_cycles - 60) < 0


def test_what_is_drawn_in_secret_changes_nothing() -> None:
    off = off_now(with_spare_fan(), "E1")
    before = [way.cost_usd for way in costed_ways(off, shelf="full")]
    for module in (*off.engine.modules, *off.view.modules.values()):
        module.budgets = [0.001 for _ in module.budgets]
        module.early_at = 1
        module.factor = 1.9
    assert [way.cost_usd for way in costed_ways(off, shelf="full")] == before


def test_rows_add_up_to_each_way() -> None:
    answer = three_ways(with_spare_fan(), "E1")
    for shelf in ("full", "empty"):
        for name in ("A1", "A2", "B"):
            total = sum(float(r["cost_usd"]) for r in answer.rows() if (r["way"], r["shelf"]) == (name, shelf))
            assert total == pytest.approx(answer.one(name, shelf).cost_usd)


def test_engines_that_do_not_come_off_are_refused() -> None:
    with pytest.raises(RequestError, match="it lies ready as a spare"):
        off_now(with_spare_fan(), "E3")
    with pytest.raises(RequestError, match="nothing limits it"):
        off_now(tiny_fleet(parts=False), "E1")
