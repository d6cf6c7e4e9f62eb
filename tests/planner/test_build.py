"""Build plans of small engines: worked by hand, no limit ever passed, rules never cheaper, ends as the lease says."""

import dataclasses
import datetime as dt
import itertools

import pytest

from planner.build import build
from planner.build_rows import actions, parts, remainder_usd, rules, spans
from planner.picture import picture
from sim.errors import NoSolutionError, RequestError
from sim.fleet import Fleet, Lease, LeaseSettlement, LeaseTerm, Part, WearRow
from tests.planner.test_three_ways import with_spare_fan
from tests.sim.builders import tiny_fleet


def discounted(fleet: Fleet, rate: float = 0.085) -> Fleet:
    return dataclasses.replace(fleet, settings=dataclasses.replace(fleet.settings, discount_rate_frac=rate))


def at_reference_derate(fleet: Fleet) -> Fleet:
    """Return the fleet flown at the derate for which its wear table holds, so that the table's figures are seen."""
    return dataclasses.replace(
        fleet, aircraft=tuple(dataclasses.replace(a, average_derate_frac=0.08) for a in fleet.aircraft)
    )


def short(fleet: Fleet, years: float) -> Fleet:
    return dataclasses.replace(fleet, settings=dataclasses.replace(fleet.settings, horizon_years=years))


def used_fan_disk(*, left: int, place: str = "market", **change: object) -> Part:
    row = Part(
        part_serial="FD-77",
        part_number="fan-disk",
        place=place,
        asking_price_usd=4_000.0,
        cycles_since_new=10_000 - left,
        flown=(("one", 10_000 - left),),
    )
    return dataclasses.replace(row, **change)


def test_one_opening_worked_by_hand() -> None:
    """Two years, 2,922 cycles, nothing discounted: the fan's disk goes at 300 cycles, the new one has 7,378 left.

    A quick visit: level 10,000, test 2,000, moves 3,000, change 10,000, a spare for 30 days at 2 % of 3,652,500 a year
    6,000; fan opened and checked 6,000; disk 40,000, of which 73.78 % are left at the end. Also left at the end: the
    core's disk 40,000 x 7,078 / 10,000 and both modules' restorations, 50,000 each, 2,922 of 100,000 cycles used.
    """
    plan = build(short(with_spare_fan(), 2.0), "E1")
    spent = 10_000 + 2_000 + 3_000 + 10_000 + 6_000 + 6_000 + 40_000
    left = 40_000 * 0.7378 + 40_000 * 0.7078 + 2 * 50_000 * (1 - 2_922 / 100_000)
    assert plan.cost_usd == pytest.approx(spent - left, abs=1.0)
    assert plan.best.bound_usd == pytest.approx(plan.cost_usd, abs=1.0)
    assert [one.part for one in plan.best.installs] == [0]


def test_with_interest_the_opening_waits_for_the_limit() -> None:
    plan = build(discounted(short(with_spare_fan(), 2.0)), "E1")
    assert [plan.points[point] for point in plan.visits] == [300]
    assert actions(plan)[0]["date"] == dt.date(2026, 9, 14)


def test_an_engine_that_is_open_is_planned_from_today() -> None:
    plan = build(discounted(short(with_spare_fan(), 2.0)), "E1", open_now=True)
    assert plan.visits[0] == 0
    assert plan.build_goal_cycles == 2_922


def test_a_used_part_of_just_enough_life_is_bought_and_told() -> None:
    fleet = short(with_spare_fan(), 2.0)
    fleet = dataclasses.replace(fleet, parts=(*fleet.parts, used_fan_disk(left=2_700)))
    plan = build(fleet, "E1")
    row = next(row for row in parts(plan) if row["part_serial"] == "fan-disk-1")
    assert (row["decision"], row["used_serial"], row["left_after_cycles"]) == ("used", "FD-77", 2_700)
    assert row["cost_usd"] == pytest.approx(4_000)


@pytest.mark.parametrize(
    "change",
    [{"life_known": False}, {"cycles_since_new": 9_000, "flown": (("one", 9_000),)}, {"ready_day": 400.0}],
    ids=["of unknown life", "of too short a life", "that comes too late"],
)
def test_a_used_part_is_left_alone(change: dict[str, object]) -> None:
    fleet = short(with_spare_fan(), 2.0)
    fleet = dataclasses.replace(fleet, parts=(*fleet.parts, used_fan_disk(left=2_700, **change)))
    row = next(row for row in parts(build(fleet, "E1")) if row["part_serial"] == "fan-disk-1")
    assert row["decision"] == "new"


def test_margin_that_runs_out_restores_the_module_that_buys_it_back() -> None:
    """The core loses 40 degC in 1,000 cycles of the 100 there are: it is restored at 2,500 cycles, the fan never."""
    wear = (
        WearRow(engine_type="T", rating="one", module="fan"),
        WearRow(engine_type="T", rating="one", module="core", loss_degC_per_1000_cycles=40.0),
    )
    plan = build(at_reference_derate(discounted(short(with_spare_fan(wear=wear, fan_used=0), 3.0))), "E1")
    assert plan.best.restored.sum(axis=1).tolist() == [0, 1]
    restored = next(row for row in actions(plan) if row["what"] == "restore")
    assert restored["serials"] == "core-1"
    at = plan.points[plan.visits[0]]
    assert at <= 2_500
    assert (plan.planned.problem.end_cycles - at) * 0.04 <= 100


def test_no_plan_passes_a_limit_on_the_way() -> None:
    """Followed cycle by cycle from its actions alone, with the limits of the tables."""
    plan = build(discounted(with_spare_fan(core_used=3_333)), "E1")
    for number, used in ((0, 9_700), (1, 3_333)):
        since = -used
        for at in sorted(plan.points[one.at] for one in plan.best.installs if one.part == number):
            assert at - since <= 10_000
            since = at
        assert plan.planned.problem.end_cycles - since <= 10_000


def test_actions_and_remainder_are_the_objective_and_no_rule_is_cheaper() -> None:
    plan = build(discounted(with_spare_fan(core_used=3_333)), "E1")
    total = sum(row["cost_usd"] for row in actions(plan)) + remainder_usd(plan)
    assert total == pytest.approx(plan.cost_usd)
    assert plan.best.gap_frac < 1e-6
    assert all(row["loses_usd"] >= -1e-6 for row in rules(plan))
    assert [row["rule"] for row in rules(plan)] == ["best", "hard goal", "exposed only", "run out"]


def test_spans_cover_the_whole_plan_without_a_gap() -> None:
    plan = build(discounted(with_spare_fan(core_used=3_333)), "E1")
    lanes: dict[str, list[dict[str, object]]] = {}
    for row in spans(plan):
        lanes.setdefault(str(row["lane"]), []).append(row)
    for rows in lanes.values():
        assert rows[0]["from_cycles"] == 0
        assert rows[-1]["to_cycles"] == plan.planned.problem.end_cycles
        assert all(a["to_cycles"] == b["from_cycles"] for a, b in itertools.pairwise(rows))


def leased(fleet: Fleet, *, terms: tuple[LeaseTerm, ...], rules: tuple[LeaseSettlement, ...] = ()) -> Fleet:
    lease = Lease(lease="L1", owner="Lessor", return_day=365.25, terms="A", tail="A1")
    return dataclasses.replace(fleet, leases=(lease,), lease_terms=terms, lease_settlements=rules)


def test_a_hard_condition_at_the_return_buys_a_part_that_half_life_alone_would_not() -> None:
    """1,461 cycles to the return leave the core's disk 1,539 of 10,000; 4,000 are wanted, hard."""
    hard = LeaseTerm(terms="A", engine_type="T", condition="part_cycles", per="part", least=4_000, remedy="hard")
    half = LeaseSettlement(terms="A", engine_type="T", event="parts", basis="half_life")
    fleet = leased(with_spare_fan(core_used=7_000, fan_used=0), terms=(hard,), rules=(half,))
    plan = build(fleet, "E1")
    assert plan.planned.end_why == "lease return"
    assert plan.planned.problem.end_cycles == 1_461
    paid_at_return = plan.planned.problem.parts[1].end(1_539)
    assert paid_at_return == pytest.approx((0.1539 - 0.5) * 40_000 - (40_000 + 10_000))


def test_margin_wanted_at_the_return_is_kept_or_said_to_be_out_of_reach() -> None:
    wear = (
        WearRow(engine_type="T", rating="one", module="fan"),
        WearRow(engine_type="T", rating="one", module="core", loss_degC_per_1000_cycles=40.0, unrecoverable_degC=5.0),
    )
    wanted = LeaseTerm(terms="A", engine_type="T", condition="margin", per="engine", least=60.0)
    fleet = at_reference_derate(with_spare_fan(wear=wear, fan_used=0))
    plan = build(leased(fleet, terms=(wanted,)), "E1")
    last = max(plan.points[point] for point in plan.visits)
    assert 100 - (1_461 - last) * 0.04 - 5 >= 60 - 1e-9
    far = dataclasses.replace(wanted, least=99.0)
    plan = build(leased(fleet, terms=(far,)), "E1")
    assert any("cannot be reached" in warning for warning in plan.warnings)


def test_impossible_engines_are_refused() -> None:
    with pytest.raises(RequestError, match="expected an engine serial"):
        build(tiny_fleet(), "E99")
    wear = (WearRow(engine_type="T", rating="one", module="core", loss_degC_per_1000_cycles=4_000.0),)
    with pytest.raises(NoSolutionError, match="build plan"):
        build(with_spare_fan(wear=wear), "E1")
    assert picture(tiny_fleet()).engine("E1").serial == "E1"
