"""How long the cycle takes: one type's coefficients, a stack of 300 types, and what a walk through the engine costs.

Printed, never a pass mark (run with ``-m bench -s``). Goals: 50 ms a type, 10 s for 300 types.
"""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable

import pytest

from sim.cycle_rules import Filled, gas_path
from sim.influence import Conditions, influence, influences

pytestmark = pytest.mark.bench


def cpu_seconds(work: Callable[[], object], *, times: int = 7) -> float:
    """Return the median CPU time of a piece of work after one run to warm up."""
    work()
    spent = []
    for _ in range(times):
        start = time.process_time()
        work()
        spent.append(time.process_time() - start)
    return statistics.median(spent)


def a_type(number: int) -> Filled:
    """Return one of many types, each with its own ratios and a fuel flow to be calibrated to."""
    bypass, overall = 4.5 + 7.0 * (number % 17) / 17.0, 24.0 + 20.0 * (number % 23) / 23.0
    thrust = 80e3 + 1e3 * number
    known = {"thrust_N": thrust, "bypass_ratio": bypass}
    plain = gas_path(known, overall_pressure_ratio=overall)
    from sim.cycle_design import designed

    fuel = float(designed(plain.path).walk.fuel_flow[0])
    return gas_path(known, overall_pressure_ratio=overall, takeoff_fuel_kg_per_s=fuel)


def test_speed_of_the_cycle() -> None:
    one = a_type(1)
    known = {"thrust_N": one.path.thrust_N, "bypass_ratio": one.path.bypass_ratio}
    rows = [
        ("gas path from bypass and pressure ratio", cpu_seconds(lambda: gas_path(known, overall_pressure_ratio=30.0))),
        ("gas path calibrated to fuel", cpu_seconds(lambda: a_type(1)) / 2),
        ("coefficients of one type, with bands", cpu_seconds(lambda: influence(one.path))),
    ]
    types = [a_type(number) for number in range(300)]

    def one_by_one() -> None:
        for filled in types:
            influence(filled.path, given=filled.given)

    def stacked() -> None:
        for first in range(0, 300, 25):
            chunk = types[first : first + 25]
            influences(
                [t.path for t in chunk],
                conditions=[Conditions()] * len(chunk),
                stations=["lpt_inlet"] * len(chunk),
                given=[t.given for t in chunk],
            )

    single, together = cpu_seconds(one_by_one, times=1), cpu_seconds(stacked, times=1)
    print()
    for name, seconds in rows:
        print(f"{name:45s} {1000 * seconds:8.1f} ms   {0.050 / seconds:5.1f} times under the goal of 50 ms")
    for name, seconds in (("300 types one by one", single), ("300 types in stacks of 25", together)):
        print(f"{name:45s} {seconds:8.2f} s    {10.0 / seconds:5.1f} times under the goal of 10 s")
