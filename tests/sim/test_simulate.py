"""A tiny fleet whose whole story is worked by hand, and what must hold on every log."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import pytest
from builders import exponential_removals, tiny_fleet

from sim.events import KIND, KINDS, Log
from sim.fleet import Fleet, Lease, LeaseMarket, Module, Part, PartLimit, Standard, Team
from sim.spec import setup
from sim.start import names
from sim.world import simulate


def run(fleet: Fleet, strategy: str = "whole_engine", *, days: float, seed: int = 1, number: int = 0) -> Log:
    ready = setup(fleet, strategy, horizon_days=days)
    return simulate(ready, names(ready), seed=seed, run=number)


def facts(log: Log, kind: str) -> list[tuple[float, str, str, str]]:
    return [(r[1], r[6], r[7], r[8]) for r in log.rows if r[0] == KIND[kind]]


def spans(log: Log, kind: str) -> list[tuple[float, float, str, str]]:
    return [(r[1], r[2], r[6], r[8]) for r in log.rows if r[0] == KIND[kind]]


def test_the_story_of_two_aircraft_and_one_spare() -> None:
    # 4 cycles a day, core disks last 1,000 cycles: both engines come off on day 250. A1 takes the spare and is down for
    # the change (2 days); A2 waits until E1 is back: 5 days there, 20 in the shop, 5 back, so day 280; then the change.
    log = run(tiny_fleet(), days=300.0)
    assert facts(log, "removal") == [(250.0, "E1", "A1", "limit core"), (250.0, "E2", "A2", "limit core")]
    assert facts(log, "install") == [(250.0, "E3", "A1", "1"), (280.0, "E1", "A2", "1")]
    assert spans(log, "down") == [
        (250.0, 252.0, "A1", "engine change"),
        (250.0, 280.0, "A2", "no engine"),
        (280.0, 282.0, "A2", "engine change"),
    ]
    flown = {(r[6], r[7]): r[9] for r in log.rows if r[0] == KIND["flown"] and r[1] > 0}
    assert flown == {("E3", "A1"): 192, ("E1", "A2"): 72}  # 4 cycles on each of 48 and 18 days
    new = [r[6] for r in log.rows if r[0] == KIND["part_on"]]
    assert new == ["core-disk-1~1", "core-disk-2~1"]


def spare_core(**changes: object) -> tuple[Module, Part]:
    module = Module(module_serial="core-s", engine_type="T", module="core", place="pool", **changes)  # type: ignore[arg-type]
    part = Part(part_serial="core-disk-s", part_number="core-disk", module_serial="core-s", cycles_since_new=0)
    return module, part


def test_an_exchange_in_the_shop_brings_the_pool_module_and_repairs_the_old_one() -> None:
    fleet = tiny_fleet(tails=1, spares=1)
    module, part = spare_core()
    fleet = replace(fleet, modules=(*fleet.modules, module), parts=(*fleet.parts, part))
    log = run(fleet, "exchange", days=400.0)
    # off on day 250, inducted on 255, exchanged there; the old core goes to repair: 5 days, 50 days, 5 days
    assert facts(log, "module_on") == [(255.0, "core-s", "E1", "")]
    assert facts(log, "module_off") == [(255.0, "core-1", "E1", "limit")]
    assert ("core-1", 315.0) in [(serial, day) for day, serial, _, _ in facts(log, "pool")]


def test_a_fan_is_exchanged_near_the_wing_by_a_team() -> None:
    fleet = tiny_fleet(tails=1, spares=0, teams=(Team(team="L", call_out_days=1.0, call_out_usd=900.0),))
    limits = tuple(replace(x, limit_cycles=1000 if x.part_number == "fan-disk" else 9000) for x in fleet.part_limits)
    spare = Module(module_serial="fan-s", engine_type="T", module="fan", place="pool")
    disk = Part(part_serial="fan-disk-s", part_number="fan-disk", module_serial="fan-s", cycles_since_new=0)
    fleet = replace(fleet, part_limits=limits, modules=(*fleet.modules, spare), parts=(*fleet.parts, disk))
    log = run(fleet, "exchange", days=300.0)
    # no spare engine: call-out 1 day, exchange 3 days, then the engine goes back on (2 days)
    assert spans(log, "down") == [(250.0, 254.0, "A1", "no engine"), (254.0, 256.0, "A1", "engine change")]
    assert facts(log, "install") == [(254.0, "E1", "A1", "1")]


def test_a_gearbox_on_the_wing_leaves_the_engine_where_it_is() -> None:
    fleet = tiny_fleet(tails=1, spares=0, teams=(Team(team="L", call_out_days=1.0),))
    kinds = tuple(replace(m, exchange_place="wing") if m.module == "fan" else m for m in fleet.module_types)
    limits = tuple(replace(x, limit_cycles=1000 if x.part_number == "fan-disk" else 9000) for x in fleet.part_limits)
    spare = Module(module_serial="fan-s", engine_type="T", module="fan", place="pool")
    disk = Part(part_serial="fan-disk-s", part_number="fan-disk", module_serial="fan-s", cycles_since_new=0)
    fleet = replace(
        fleet, module_types=kinds, part_limits=limits, modules=(*fleet.modules, spare), parts=(*fleet.parts, disk)
    )
    log = run(fleet, "exchange", days=300.0)
    assert spans(log, "down") == [(250.0, 254.0, "A1", "exchange on the wing")]
    assert facts(log, "install") == []


def test_a_directive_takes_the_engine_off_by_its_day_and_never_later() -> None:
    fleet = tiny_fleet(tails=1, spares=1)
    cut = PartLimit(
        part_number="core-disk",
        rating="one",
        limit_cycles=300,
        valid_from_day=100.0,
        serial_prefix="core-disk-",
        serial_from=1,
        serial_to=1,
        directive="D-1",
    )
    log = run(replace(fleet, part_limits=(*fleet.part_limits, cut)), days=120.0)
    [(day, *what)] = facts(log, "removal")
    assert what == ["E1", "A1", "directive core"]
    assert 100.0 - 1e-6 < day <= 100.0


def test_unknown_life_comes_off_on_the_first_day() -> None:
    fleet = tiny_fleet(tails=1, spares=1)
    parts = tuple(replace(p, life_known=False) if p.part_serial == "core-disk-1" else p for p in fleet.parts)
    log = run(replace(fleet, parts=parts), days=10.0)
    assert facts(log, "removal") == [(0.0, "E1", "A1", "unknown_life core")]


def test_a_lease_in_comes_after_its_lead_time_and_goes_when_a_spare_is_back() -> None:
    fleet = tiny_fleet(tails=1, spares=0)
    market = LeaseMarket(engine_type="T", usd_per_month=30_437.5, lead_days=4.0, chance=1.0, least_days=10)
    log = run(replace(fleet, lease_market=(market,)), days=300.0)
    # off on 250, sought on 253, there on 257; the own engine is back on 280 and the rented one is called back
    assert facts(log, "lease_sought") == [(253.0, "A1", "", "found")]
    assert [day for day, _, _, _ in facts(log, "lease_start")] == [257.0]
    assert facts(log, "lease_end")[-1][0] == 280.0
    assert [(day, e) for day, e, _, _ in facts(log, "install")] == [(257.0, "lease/A1/0"), (280.0, "E1")]


def test_a_lease_return_that_leaves_takes_aircraft_and_engine() -> None:
    fleet = tiny_fleet(tails=2, spares=0, leases=(Lease(lease="L", owner="X", return_day=50.0, terms="A", tail="A1"),))
    engines = tuple(replace(e, owner="X") if e.engine_serial == "E1" else e for e in fleet.engines)
    log = run(replace(fleet, engines=engines), days=100.0)
    assert facts(log, "exit") == [(50.0, "A1", "", "")]
    ends = {r[6] for r in log.rows if r[0] == KIND["value"] and r[8] == "end"}
    assert "core-1" not in ends
    assert "core-2" in ends


def check_conservation(log: Log, fleet: Fleet) -> None:
    """Assert that every serial is in one place at a time and that cycles flown agree with cycles removed."""
    on: dict[str, str] = {e.engine_serial: e.tail for e in fleet.engines if e.place == "wing"}
    since: Counter[str] = Counter()
    for row in sorted(log.rows, key=lambda r: r[1] if r[0] != KIND["flown"] else r[2]):
        kind, _, _, _, _, _, subject, other, _, cycles, _ = row
        name = KINDS[kind]
        if name == "install":
            assert not on.get(subject), f"{subject} is on {on[subject]} and installed on {other}"
            on[subject] = other
            since[subject] = 0
        elif name == "flown":
            assert on[subject] == other
            since[subject] += cycles
        elif name == "removal":
            assert on[subject] == other
            assert since[subject] == cycles
            on[subject] = ""
    flying = Counter(tail for tail in on.values() if tail)
    assert all(flying[a.tail] <= a.positions for a in fleet.aircraft)


def busy_fleet() -> Fleet:
    fleet = exponential_removals(tiny_fleet(tails=6, spares=2), per_hour=1 / 900)
    module, part = spare_core()
    fleet = replace(
        fleet,
        modules=(*fleet.modules, module),
        parts=(*fleet.parts, part),
        lease_market=(LeaseMarket(engine_type="T", usd_per_month=30_000.0, chance=0.5),),
    )
    return replace(fleet, shops=(replace(fleet.shops[0], inductions_per_month=2.0, turn_time_law="exponential"),))


@pytest.mark.parametrize("strategy", ["whole_engine", "exchange", "cheapest"])
@pytest.mark.parametrize("number", range(4))
def test_everything_is_conserved(strategy: str, number: int) -> None:
    fleet = busy_fleet()
    log = run(fleet, strategy, days=2500.0, number=number)
    installs = [r for r in log.rows if r[0] == KIND["install"]]
    assert len(installs) > 10
    _conserved_modules(log, fleet)
    check_conservation(log, fleet)
    for part_row in (r for r in log.rows if r[0] == KIND["part_off"]):
        assert part_row[9] <= (1000 if part_row[6].startswith("core") else 10_000)  # a limit is never passed


def _conserved_modules(log: Log, fleet: Fleet) -> None:
    inside = {m.module_serial: m.engine_serial for m in fleet.modules}
    for row in log.rows:
        if row[0] == KIND["module_off"]:
            assert inside[row[6]] == row[7]
            inside[row[6]] = ""
        elif row[0] == KIND["module_on"]:
            assert inside[row[6]] == ""
            inside[row[6]] = row[7]
    per_engine = Counter(engine for engine in inside.values() if engine)
    assert set(per_engine.values()) == {2}


def test_the_same_run_gives_the_same_log() -> None:
    fleet = busy_fleet()
    assert run(fleet, days=1500.0, number=3).rows == run(fleet, days=1500.0, number=3).rows
    assert run(fleet, days=1500.0, number=3).rows != run(fleet, days=1500.0, number=4).rows


def test_cycles_flown_and_removed_agree() -> None:
    fleet = tiny_fleet(tails=3, spares=1)
    check_conservation(run(fleet, days=1200.0), fleet)


def test_a_longer_horizon_begins_with_the_shorter_one() -> None:
    fleet = busy_fleet()
    short, long = run(fleet, days=600.0), run(fleet, days=1200.0)
    removals = facts(short, "removal")
    assert removals == facts(long, "removal")[: len(removals)]


def test_a_valuation_inside_the_study_moves_nothing() -> None:
    fleet = busy_fleet()
    plain = setup(fleet, "exchange", horizon_days=1200.0)
    swept = setup(fleet, "exchange", horizon_days=1200.0, sweep_days=(400.0, 800.0))
    a = simulate(plain, names(plain), seed=1, run=0)
    b = simulate(swept, names(swept), seed=1, run=0)
    for kind in ("removal", "install", "down", "module_on", "lease_sought"):
        assert facts(a, kind) == facts(b, kind)
    assert sum(r[9] for r in a.rows if r[0] == KIND["flown"]) == sum(r[9] for r in b.rows if r[0] == KIND["flown"])


def _with_spare_core(fleet: Fleet, **changes: object) -> Fleet:
    module, part = spare_core(**changes)
    return replace(fleet, modules=(*fleet.modules, module), parts=(*fleet.parts, part))


def test_a_module_of_a_standard_that_does_not_mate_stays_on_the_shelf() -> None:
    pairs = (Standard(engine_type="T", module="core", standard="", mates_with_module="fan", mates_with_standard=""),)
    fleet = _with_spare_core(tiny_fleet(tails=1, spares=1), standard="old")
    assert facts(run(fleet, "exchange", days=300.0), "module_on") != []
    assert facts(run(replace(fleet, standards=pairs), "exchange", days=300.0), "module_on") == []


def test_a_lease_that_allows_no_exchange_keeps_other_owners_modules_out() -> None:
    fleet = _with_spare_core(tiny_fleet(tails=1, spares=0))
    fleet = replace(fleet, engines=tuple(replace(e, owner="X") for e in fleet.engines))
    for rule, exchanged in (("own_back", True), ("never", False)):
        lease = Lease(lease="L", owner="X", return_day=5000.0, terms="A", tail="A1", exchange_rule=rule)
        log = run(replace(fleet, leases=(lease,)), "exchange", days=300.0)
        assert (facts(log, "module_on") != []) is exchanged
