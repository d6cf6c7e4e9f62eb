"""What is left at a day: life of parts, restorations of modules, and spare stock, as rows that the ledger prices.

Owned assets count by the fraction left. Leased ones count from half life (fraction less one half): the life used shows
as the return liability accrued, whatever the lease's own settlement pays in cash (METHOD.md, Money).
"""

from __future__ import annotations

from collections.abc import Iterable

from sim.events import KIND, Log
from sim.pricing import Catalogue
from sim.state import EngineState, ModuleState

_VALUE = KIND["value"]


def module_fraction(module: ModuleState) -> float:
    """Return the share of the expected interval left, the less of cycles and hours."""
    spec = module.spec
    return max(0.0, 1.0 - max(module.csr / spec.interval_cycles, module.hsr / spec.interval_hours))


def value_module(
    log: Log,
    module: ModuleState,
    *,
    day: float,
    end: str,
    rating: int,
    catalogue: Catalogue,
    lessors: frozenset[str],
    sign: float = 1.0,
) -> None:
    """Write what a module and its parts hold. ``end``: start or end; ``sign`` -1 takes a value back."""
    spec = module.spec
    base = 0.5 if module.owner in lessors else 0.0
    item = catalogue.number("life", end, spec.engine_type, spec.module)
    log.rows.append(
        (_VALUE, day, day, day, item, sign * (module_fraction(module) - base), module.serial, "", end, 0, 0.0)
    )
    for part in module.parts:
        base = 0.5 if part.owner in lessors else 0.0
        item = catalogue.number("life", end, part.spec.part_number)
        left = part.fraction_left(module.run, rating, day)
        log.rows.append((_VALUE, day, day, day, item, sign * (left - base), part.serial, module.serial, end, 0, 0.0))


def value_engines(
    log: Log,
    engines: Iterable[tuple[EngineState, int]],
    *,
    day: float,
    end: str,
    catalogue: Catalogue,
    lessors: frozenset[str],
) -> None:
    """Write what engines (with the rating number that each is valued at) hold."""
    for engine, rating in engines:
        for module in engine.modules:
            value_module(log, module, day=day, end=end, rating=rating, catalogue=catalogue, lessors=lessors)
