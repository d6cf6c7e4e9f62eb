"""Off design: the design point again, balances, one root and no other, and what is refused."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy import optimize

from sim.atmosphere import SEA_LEVEL_PA
from sim.cycle import cruise, stations, takeoff
from sim.cycle_components import choked_throat
from sim.cycle_design import Engine, design, designed, sea_level
from sim.cycle_inputs import CHANGES, Change, Flight, GasPath, changes_of, stacked
from sim.cycle_offdesign import at, misfit, solve
from sim.cycle_path import walk
from sim.cycle_rules import gas_path
from sim.errors import NoSolutionError, OutOfRangeError, UserError


def an_engine(
    *,
    thrust_N: float = 117e3,
    bypass_ratio: float = 5.1,
    overall_pressure_ratio: float = 27.6,
    spools: int = 2,
    exhaust: str = "separate",
    **known: float,
) -> GasPath[float]:
    values = {"thrust_N": thrust_N, "bypass_ratio": bypass_ratio, **known}
    filled = gas_path(values, overall_pressure_ratio=overall_pressure_ratio, spools=spools, exhaust=exhaust)
    return filled.path


ARCHITECTURES = [(2, "separate"), (3, "separate"), (2, "mixed"), (3, "mixed")]


@pytest.mark.parametrize(("spools", "exhaust"), ARCHITECTURES)
def test_the_design_point_comes_back(spools: int, exhaust: str) -> None:
    path = an_engine(spools=spools, exhaust=exhaust)
    engine, state = designed(path), takeoff(path)
    for before, after in zip(engine.point, state.point, strict=True):
        assert after[0] == pytest.approx(before[0], rel=1e-10)
    assert state.walk.fuel_flow[0] == pytest.approx(engine.walk.fuel_flow[0], rel=1e-10)


@pytest.mark.parametrize(("spools", "exhaust"), ARCHITECTURES)
def test_metal_stays_as_it_is(spools: int, exhaust: str) -> None:
    path = an_engine(spools=spools, exhaust=exhaust)
    sizes = designed(path).sizes
    done = takeoff(path, thrust_frac=0.8, ambient_K=300.0).walk
    assert choked_throat(done.turbines.hpt_inlet)[0] == pytest.approx(sizes.hpt_throat[0], rel=1e-10)
    assert choked_throat(done.turbines.lpt_inlet)[0] == pytest.approx(sizes.lpt_throat[0], rel=1e-10)
    assert done.exhaust.core_jet.area[0] == pytest.approx(sizes.core_nozzle[0], rel=1e-10)
    if exhaust == "separate":
        assert done.exhaust.bypass_jet.area[0] == pytest.approx(sizes.bypass_nozzle[0], rel=1e-10)


def test_an_engine_without_a_booster_runs() -> None:
    path = an_engine(middle_pressure_ratio=1.0)
    state = takeoff(path, thrust_frac=0.85)
    assert state.point.middle_pressure_ratio[0] == pytest.approx(1.0, abs=1e-10)
    assert state.walk.compressors.middle.work[0] == pytest.approx(0.0, abs=1e-3)


def test_corrected_thrust_and_temperature_ratio_belong_together() -> None:
    # The same corrected thrust in cold and warm air is the same point of work, but for variable specific heats and the
    # gas constant: turbine-entry over ambient temperature moves little, and k = dEGT/dT is near EGT over ambient.
    path = an_engine()
    cold, warm = takeoff(path, ambient_K=278.15), takeoff(path, ambient_K=298.15)
    ratios = [s.walk.turbines.lpt_inlet.temperature[0] / t for s, t in ((cold, 278.15), (warm, 298.15))]
    assert ratios[0] == pytest.approx(ratios[1], rel=0.01)


def follow(engine: Engine, *, flight: Flight, thrust_N: float, steps: int = 6) -> np.ndarray:
    """Return the point's logarithms by another solver that walks from the design point in small steps."""
    start = sea_level(1)
    place = np.zeros(6)
    for share in np.linspace(0.0, 1.0, steps + 1)[1:]:
        air = Flight(*(a + share * (b - a) for a, b in zip(start, flight, strict=True)))
        thrust = engine.path.thrust_N + share * (thrust_N - engine.path.thrust_N)

        def residual(x: np.ndarray, air: Flight = air, thrust: np.ndarray = thrust) -> np.ndarray:
            done = walk(engine.path, at(engine, x[:, None]), flight=air, lost={})
            return misfit(engine, done, flight=air, thrust_N=thrust, lost={})[:, 0]

        # With full output that solver does not warn; where it gives up, smaller steps are taken.
        place = optimize.fsolve(residual, place, xtol=1e-10, full_output=True)[0]
        if not np.max(np.abs(residual(place))) < 1e-8:
            assert steps < 500, "the walk from the design point does not arrive"
            return follow(engine, flight=flight, thrust_N=thrust_N, steps=4 * steps)
    return place


WIDE = st.fixed_dictionaries(
    {
        "thrust_N": st.floats(5e3, 600e3),
        "bypass_ratio": st.floats(2.0, 15.0),
        "overall_pressure_ratio": st.floats(10.0, 60.0),
        "turbine_entry_K": st.floats(1400.0, 1900.0),
        "hpc_efficiency": st.floats(0.82, 0.9),
        "lpt_efficiency": st.floats(0.88, 0.94),
        "loading_slope": st.floats(0.5, 10.0),
        "spools": st.sampled_from([2, 3]),
        "exhaust": st.sampled_from(["separate", "mixed"]),
    }
)


def check_the_root(known: dict[str, float], share: float, ambient: float) -> None:
    """Compare with the walk from the design point, which cannot jump to another root unseen."""
    try:
        path = an_engine(**known)  # type: ignore[arg-type]
        engine, state = designed(path), takeoff(path, thrust_frac=share, ambient_K=ambient)
    except UserError:
        assume(False)
        return
    flight = Flight(np.array([ambient]), np.array([SEA_LEVEL_PA]), np.zeros(1))
    with np.errstate(invalid="ignore"):
        logs = follow(engine, flight=flight, thrust_N=share * path.thrust_N)
    followed = at(engine, logs[:, None])
    for one, other in zip(state.point, followed, strict=True):
        assert one[0] == pytest.approx(other[0], rel=1e-7)


@settings(max_examples=12, deadline=None)
@given(known=WIDE, share=st.floats(0.6, 1.1), ambient=st.floats(233.0, 323.0))
def test_the_root_is_the_one_that_a_walk_from_the_design_point_finds(
    known: dict[str, float], share: float, ambient: float
) -> None:
    check_the_root(known, share, ambient)


@pytest.mark.long
@settings(max_examples=600, deadline=None)
@given(known=WIDE, share=st.floats(0.6, 1.1), ambient=st.floats(233.0, 323.0))
def test_no_other_root_is_found_in_many_engines(known: dict[str, float], share: float, ambient: float) -> None:
    check_the_root(known, share, ambient)


@settings(max_examples=40, deadline=None)
@given(known=WIDE, share=st.floats(0.6, 1.1), ambient=st.floats(233.0, 323.0), data=st.data())
def test_a_worn_engine_balances_or_is_refused(
    known: dict[str, float], share: float, ambient: float, data: st.DataObject
) -> None:
    lost = {
        change: data.draw(st.floats(-0.02, 0.08))
        for change in changes_of(int(known["spools"]))
        if change.component != "combustor"
    }
    try:
        path = an_engine(**known)  # type: ignore[arg-type]
        state = takeoff(path, thrust_frac=share, ambient_K=ambient, lost=lost)
    except UserError:
        assume(False)
        return
    cold, hot, exhaust = state.walk
    heat = state.walk.fuel_flow * path.fuel_heat_J_per_kg * path.combustor_efficiency
    core, air = cold.middle.outlet.flow, cold.intake.flow
    shafts = core * (cold.hpc.work + cold.middle.work) + air * cold.fan.work
    leaving = exhaust.core.flow * exhaust.core.enthalpy + exhaust.bypass.flow * exhaust.bypass.enthalpy
    entering = air * cold.intake.enthalpy + heat
    error = leaving - entering + shafts * (1.0 / path.shaft_efficiency - 1.0)
    assert abs(error[0] / heat[0]) < 1e-9
    assert (exhaust.core.flow + exhaust.bypass.flow)[0] == pytest.approx((air + hot.combustor_exit.fuel)[0], rel=1e-12)
    assert state.walk.net_thrust[0] == pytest.approx(share * path.thrust_N, rel=1e-10)
    assert state.residual[0] < 1e-11


@pytest.mark.parametrize(("spools", "exhaust"), ARCHITECTURES)
def test_fuel_and_temperature_rise_with_thrust(spools: int, exhaust: str) -> None:
    path = an_engine(spools=spools, exhaust=exhaust)
    states = [takeoff(path, thrust_frac=share) for share in np.linspace(0.6, 1.1, 11)]
    for quantity in (
        [s.walk.fuel_flow[0] for s in states],
        [s.point.turbine_entry_K[0] for s in states],
        [s.walk.turbines.lpt_inlet.temperature[0] for s in states],
    ):
        assert np.all(np.diff(quantity) > 0.0)


def test_a_stack_gives_what_each_engine_gives_alone() -> None:
    paths = [an_engine(), an_engine(bypass_ratio=9.0, overall_pressure_ratio=40.0, thrust_N=320e3)]
    thrust = np.array([0.8 * path.thrust_N for path in paths])
    together = solve(design(stacked(paths)), flight=sea_level(2), thrust_N=thrust, lost={})
    for k, path in enumerate(paths):
        alone = takeoff(path, thrust_frac=0.8)
        assert together.walk.fuel_flow[k] == pytest.approx(alone.walk.fuel_flow[0], rel=1e-9)


def test_cruise_burns_what_such_engines_burn() -> None:
    # 16 to 19 g/(kN s) at 35,000 ft and Mach 0.80 for engines of bypass ratio 5 (from memory).
    state = cruise(an_engine(), height_m=10_668.0, mach=0.80, thrust_N=0.19 * 117e3)
    assert 16.0 < state.walk.fuel_flow[0] / (0.19 * 117e3) * 1e6 < 19.0


@pytest.mark.parametrize("share", [0.07, 0.30, 0.599, 1.101, float("nan")])
def test_idle_and_too_much_thrust_are_refused(share: float) -> None:
    with pytest.raises(OutOfRangeError, match=r"share of rated thrust: found .*expected 0.6 to 1.1"):
        takeoff(an_engine(), thrust_frac=share)


@pytest.mark.parametrize(
    ("change", "share"),
    [
        (Change("hpt", "efficiency"), 0.081),
        (Change("hpt", "efficiency"), -0.021),
        (Change("fan", "flow_capacity"), 0.2),
    ],
)
def test_a_loss_beyond_the_range_is_refused(change: Change, share: float) -> None:
    with pytest.raises(OutOfRangeError, match=change.component):
        takeoff(an_engine(), lost={change: share})


def test_a_component_that_the_engine_lacks_is_refused() -> None:
    with pytest.raises(OutOfRangeError, match="ipt efficiency"):
        takeoff(an_engine(), lost={Change("ipt", "efficiency"): 0.01})


def test_thrust_beyond_any_root_is_refused() -> None:
    with pytest.raises(NoSolutionError, match="no acceptable root"):
        cruise(an_engine(), height_m=10_668.0, mach=0.80, thrust_N=117e3)


def test_stations_run_from_fan_to_nozzles_with_falling_pressure_behind_the_combustor() -> None:
    path = an_engine(spools=3)
    rows = stations(path, takeoff(path).walk)
    assert [row.station for row in rows] == ["2", "13", "21", "25", "3", "4", "41", "43", "45", "5", "8", "18"]
    hot = [row.pressure_kPa for row in rows if row.station in ("3", "4", "43", "45", "5", "8")]
    assert hot == sorted(hot, reverse=True)
    assert rows[0].pressure_kPa == pytest.approx(101.325)


def test_every_change_has_one_name() -> None:
    assert len(set(CHANGES)) == len(CHANGES) == 16
