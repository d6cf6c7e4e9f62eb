"""Spare engines and modules on the shelf, and who waits for them. Ties by day, then serial."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from sim.state import EngineState, ModuleState

if TYPE_CHECKING:
    from sim.aircraft import AircraftProcess


class EnginePool:
    """Spare engines of one type and the aircraft that wait for one, first come first served."""

    __slots__ = ("engines", "waiting")

    def __init__(self) -> None:
        self.engines: list[EngineState] = []
        self.waiting: list[tuple[float, str, int, AircraftProcess]] = []

    def ask(self, day: float, aircraft: AircraftProcess, position: int) -> None:
        self.waiting.append((day, aircraft.row.tail, position, aircraft))
        self.waiting.sort(key=lambda one: one[:3])

    def withdraw(self, aircraft: AircraftProcess) -> None:
        self.waiting = [one for one in self.waiting if one[3] is not aircraft]

    def take(self, fits: Callable[[EngineState], float]) -> EngineState | None:
        """Take the spare with the least value of ``fits`` (inf: does not fit); None when none fits."""
        best, best_value = None, float("inf")
        for engine in self.engines:
            value = fits(engine)
            if value < best_value:
                best, best_value = engine, value
        if best is not None:
            self.engines.remove(best)
        return best


class ModulePool:
    """Spare modules of one type on the shelf, in the order in which they came, and those expected."""

    __slots__ = ("coming", "modules")

    def __init__(self) -> None:
        self.modules: list[ModuleState] = []
        self.coming: dict[str, tuple[int, float]] = {}

    def take(self, serial: str) -> ModuleState:
        for module in self.modules:
            if module.serial == serial:
                self.modules.remove(module)
                return module
        raise KeyError(serial)
