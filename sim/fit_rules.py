"""May this module go on this engine on this tail? Six tests, each refusal with its reason.

The tests are common practice: part number and position, modification standard, rating (a limit published and life left
there), aircraft, operation (ETOPS), papers and owner. Like work on both engines of an ETOPS aircraft in one visit is to
be avoided (14 CFR 121.374). Pure values, no fleet-wide state: who calls gathers what the tests look at.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import NamedTuple

from sim.fleet import Standard

Mates = Mapping[tuple[str, str, str], frozenset[tuple[str, str]]]
"""Pairs of standards that may mate, by engine type and pair of modules; a pair without an entry may always mate."""


class Refusal(NamedTuple):
    """``test`` is one of position, standard, rating, aircraft, operation, papers."""

    test: str
    reason: str


class FitPart(NamedTuple):
    """A part of the module offered. ``limit_cycles`` is the limit in force at the rating to be flown (None: none is
    published), ``cycles_left`` what is left there; ``belongs_to`` the engine type and module of its part number."""

    serial: str
    part_number: str
    belongs_to: tuple[str, str]
    limit_cycles: int | None
    cycles_left: int
    known: bool = True
    trace_to_birth: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Offered:
    """A module that might be fitted. ``exchange_rule`` is that of the lease it is under (blank: none)."""

    module_serial: str
    engine_type: str
    module: str
    standard: str = ""
    owner: str = ""
    exchange_rule: str = ""
    parts: tuple[FitPart, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Receiver:
    """Where it might go: an engine's place for one module, on a tail or (``tail`` blank) on a shelf.

    ``neighbours`` are the module names and standards that stay in the engine; ``ratings`` those that the type has;
    ``worked_on_beside`` the modules of the tail's other engines that are exchanged or opened in the same visit.
    """

    engine_serial: str
    engine_type: str
    module: str
    rating: str
    ratings: tuple[str, ...]
    neighbours: tuple[tuple[str, str], ...] = ()
    owner: str = ""
    exchange_rule: str = ""
    asks_for_trace: bool = False
    tail: str = ""
    aircraft_type: str = ""
    leaves_day: float | None = None
    etops_minutes: int = 0
    worked_on_beside: tuple[str, ...] = ()


def mates_of(standards: Iterable[Standard]) -> Mates:
    """Return the pairs of standards that may mate."""
    pairs: dict[tuple[str, str, str], set[tuple[str, str]]] = {}
    for row in standards:
        key = (row.engine_type, row.module, row.mates_with_module)
        pairs.setdefault(key, set()).add((row.standard, row.mates_with_standard))
    return {key: frozenset(held) for key, held in pairs.items()}


def may_fit(
    module: Offered, receiver: Receiver, *, mates: Mates, day: float = 0.0, least_cycles: int = 1
) -> tuple[Refusal, ...]:
    """Return why a module may not go where it is offered; empty when it may.

    ``least_cycles`` is the life that every part must have left at the rating to be flown.
    """
    return (
        *_position(module, receiver),
        *_standard(module, receiver, mates),
        *_rating(module, receiver, least_cycles),
        *_aircraft(receiver, day),
        *_operation(module, receiver),
        *_papers(module, receiver),
    )


def _position(module: Offered, receiver: Receiver) -> list[Refusal]:
    if module.engine_type != receiver.engine_type:
        reason = f"{module.module_serial} is of type {module.engine_type}, the engine of type {receiver.engine_type}"
        return [Refusal("position", reason)]
    if module.module != receiver.module:
        return [
            Refusal("position", f"{module.module_serial} is a {module.module}, the place is for a {receiver.module}")
        ]
    return [
        Refusal("position", f"part number {part.part_number} of {part.serial} does not belong in a {receiver.module}")
        for part in module.parts
        if part.belongs_to != (receiver.engine_type, receiver.module)
    ]


def mismatch(
    engine_type: str, module: str, standard: str, neighbours: Iterable[tuple[str, str]], mates: Mates
) -> list[tuple[str, str]]:
    """Return the neighbours (module, standard) with which a module of that standard does not mate."""
    odd = []
    for other, other_standard in neighbours:
        if other == module:
            continue
        allowed = mates.get((engine_type, module, other))
        mirrored = mates.get((engine_type, other, module))
        if (allowed is not None and (standard, other_standard) not in allowed) or (
            mirrored is not None and (other_standard, standard) not in mirrored
        ):
            odd.append((other, other_standard))
    return odd


def _standard(module: Offered, receiver: Receiver, mates: Mates) -> list[Refusal]:
    odd = mismatch(receiver.engine_type, module.module, module.standard, receiver.neighbours, mates)
    return [
        Refusal(
            "standard",
            f"{module.module} of standard {module.standard or 'unknown'} does not mate with "
            f"{other} of standard {standard or 'unknown'}",
        )
        for other, standard in odd
    ]


def _rating(module: Offered, receiver: Receiver, least_cycles: int) -> list[Refusal]:
    refusals = []
    for part in module.parts:
        if part.limit_cycles is None:
            refusals.append(Refusal("rating", f"no limit is published for {part.serial} at rating {receiver.rating}"))
        elif part.known and part.cycles_left < least_cycles:
            left = f"{part.cycles_left:,} cycles left of {part.limit_cycles:,} at rating {receiver.rating}"
            refusals.append(Refusal("rating", f"{part.serial} has {left}, {least_cycles:,} are needed"))
    return refusals


def _aircraft(receiver: Receiver, day: float) -> list[Refusal]:
    refusals = []
    if receiver.rating not in receiver.ratings:
        refusals.append(Refusal("aircraft", f"rating {receiver.rating} is none of type {receiver.engine_type}"))
    if not receiver.tail:
        return refusals
    if receiver.aircraft_type != receiver.engine_type:
        reason = f"{receiver.tail} flies engines of type {receiver.aircraft_type}, not {receiver.engine_type}"
        refusals.append(Refusal("aircraft", reason))
    if receiver.leaves_day is not None and receiver.leaves_day <= day:
        refusals.append(Refusal("aircraft", f"{receiver.tail} has left the fleet by then"))
    return refusals


def _operation(module: Offered, receiver: Receiver) -> list[Refusal]:
    if not receiver.etops_minutes or module.module not in receiver.worked_on_beside:
        return []
    reason = (
        f"{receiver.tail} flies ETOPS {receiver.etops_minutes} min and the {module.module} of its other engine is "
        "worked on in the same visit (like work on both engines)"
    )
    return [Refusal("operation", reason)]


def _papers(module: Offered, receiver: Receiver) -> list[Refusal]:
    refusals = [
        Refusal("papers", f"the life of {part.serial} is not proven by its records; unknown life is no life")
        for part in module.parts
        if not part.known
    ]
    if receiver.asks_for_trace:
        refusals += [
            Refusal("papers", f"{part.serial} has no trace to birth, which the lease of the engine asks for")
            for part in module.parts
            if not part.trace_to_birth
        ]
    if module.owner != receiver.owner and "never" in (module.exchange_rule, receiver.exchange_rule):
        whose = f"{module.module_serial} belongs to {module.owner or 'nobody named'}"
        refusals.append(
            Refusal(
                "papers", f"{whose}, the engine to {receiver.owner or 'nobody named'}; the lease allows no exchange"
            )
        )
    return refusals
