"""Rules on places: every serial is in one place, and what is there belongs there."""

from __future__ import annotations

from collections.abc import Iterator

from planner.checks.facts import Facts
from planner.checks.fault import Fault, Rule, stops, warns
from sim.fit_rules import Mates, mates_of, mismatch
from sim.fleet import Standard


def engine_positions_hold_one_engine(facts: Facts) -> Iterator[Fault]:
    seen: dict[tuple[str, int], tuple[int, str]] = {}
    names = ("engine_serial", "place", "tail", "position")
    for row, serial, place, tail, position in facts.records["engines"].pick(*names):
        if place not in ("wing", "leased_in") or not tail or position is None:
            continue
        if (tail, position) in seen:
            other_row, other = seen[tail, position]
            message = f"{serial} is at position {position} of {tail}, where {other} of row {other_row} is; mend one"
            yield Fault("engines", row, "position", f"{tail} {position}", "one engine a position", message)
        else:
            seen[tail, position] = row, serial


def engines_on_a_wing_name_tail_and_position(facts: Facts) -> Iterator[Fault]:
    for serial, engine in facts.engines.items():
        if engine.place == "wing" or (engine.place == "leased_in" and engine.tail):
            for column, value in (("tail", engine.tail), ("position", engine.position)):
                if value in (None, "") and (engine.row, column) not in facts.records["engines"].faulty:
                    message = f"{serial} is on a wing without a {column}; fill it, or change its place"
                    yield Fault("engines", engine.row, column, "blank", f"a {column}", message)


def positions_exist_on_the_aircraft(facts: Facts) -> Iterator[Fault]:
    for serial, engine in facts.engines.items():
        tail = facts.tails.get(engine.tail or "")
        if tail and engine.position is not None and tail.positions is not None and engine.position > tail.positions:
            message = f"{serial} is at position {engine.position}, {engine.tail} has {tail.positions}; mend one of them"
            yield Fault("engines", engine.row, "position", str(engine.position), f"1 to {tail.positions}", message)


def engines_are_of_the_type_of_their_aircraft(facts: Facts) -> Iterator[Fault]:
    for serial, engine in facts.engines.items():
        tail = facts.tails.get(engine.tail or "")
        if tail and engine.engine_type and tail.engine_type and engine.engine_type != tail.engine_type:
            message = f"{serial} is of type {engine.engine_type}, {engine.tail} flies {tail.engine_type}; mend one"
            yield Fault("engines", engine.row, "engine_type", engine.engine_type, tail.engine_type, message)


def aircraft_have_an_engine_in_every_position(facts: Facts) -> Iterator[Fault]:
    filled: dict[str, set[int]] = {}
    for engine in facts.engines.values():
        if engine.place in ("wing", "leased_in") and engine.tail and engine.position is not None:
            filled.setdefault(engine.tail, set()).add(engine.position)
    for name, tail in facts.tails.items():
        count = len(filled.get(name, ()))
        if tail.present and tail.positions is not None and count < tail.positions and facts.told("engines"):
            message = f"{name} has {count} of {tail.positions} engines; taken as grounded until a spare fits"
            yield Fault("aircraft", tail.row, "positions", str(count), str(tail.positions), message)


def modules_are_in_one_place(facts: Facts) -> Iterator[Fault]:
    bad = {row for row, _ in facts.records["modules"].faulty}
    for serial, module in facts.modules.items():
        if bool(module.engine_serial) == bool(module.place) and module.row not in bad:
            found = f"engine {module.engine_serial} and {module.place}" if module.place else "neither engine nor place"
            message = f"{serial} has {found}; give the engine it is in, or the place where it lies"
            yield Fault("modules", module.row, "engine_serial", found, "one of the two", message)


def parts_are_in_one_place(facts: Facts) -> Iterator[Fault]:
    seen: dict[str, tuple[int, str]] = {}
    bad = {row for row, _ in facts.records["parts"].faulty}
    for row, serial, module, place in facts.records["parts"].pick("part_serial", "module_serial", "place"):
        if not serial or row in bad:
            continue
        where = module or place or ""
        if bool(module) == bool(place):
            found = f"module {module} and {place}" if place else "neither module nor place"
            message = f"{serial} has {found}; give the module it is in, or the place where it lies"
            yield Fault("parts", row, "module_serial", found, "one of the two", message)
        if serial in seen and seen[serial][1] != where:
            other_row, other = seen[serial]
            message = f"{serial} is in {where} here and in {other} in row {other_row}; one part has one place"
            yield Fault("parts", row, "module_serial", where, other, message)
        seen.setdefault(serial, (row, where))


def engines_hold_each_module_once(facts: Facts) -> Iterator[Fault]:
    for engine, serials in facts.modules_of.items():
        seen: dict[str, str] = {}
        for serial in serials:
            module = facts.modules[serial]
            other = seen.setdefault(module.module, serial)
            if other != serial and module.module:
                message = f"engine {engine} holds {other} already as its {module.module}; mend one of them"
                yield Fault("modules", module.row, "engine_serial", serial, f"one {module.module}", message)


def engines_are_complete(facts: Facts) -> Iterator[Fault]:
    if not facts.told("modules") or not facts.told("module_types"):
        return
    for serial, engine in facts.engines.items():
        if engine.place not in ("wing", "spare"):
            continue
        held = {facts.modules[module].module for module in facts.modules_of.get(serial, ())}
        missing = [name for name in facts.module_names.get(engine.engine_type, ()) if name not in held]
        if missing:
            message = (
                f"{serial} ({engine.place}) has no {', '.join(missing)}; add the module, or change the engine's place"
            )
            yield Fault("engines", engine.row, "engine_serial", ", ".join(missing), "every module", message)


def modules_are_of_the_type_of_their_engine(facts: Facts) -> Iterator[Fault]:
    for serial, module in facts.modules.items():
        engine = facts.engines.get(module.engine_serial or "")
        if engine and engine.engine_type and module.engine_type and engine.engine_type != module.engine_type:
            message = f"{serial} is of type {module.engine_type}, engine {module.engine_serial} of {engine.engine_type}"
            yield Fault("modules", module.row, "engine_type", module.engine_type, engine.engine_type, message)


def parts_belong_in_their_module(facts: Facts) -> Iterator[Fault]:
    for row, serial, number, module_serial in facts.records["parts"].pick(
        "part_serial", "part_number", "module_serial"
    ):
        kind, module = facts.numbers.get(number), facts.modules.get(module_serial or "")
        if kind and module and (kind.engine_type, kind.module) != (module.engine_type, module.module):
            message = (
                f"{serial} of number {number} belongs in a {kind.module} of type {kind.engine_type}, "
                f"{module_serial} is a {module.module} of {module.engine_type}; mend one of them"
            )
            yield Fault("parts", row, "module_serial", module_serial, f"a {kind.module}", message)


def modules_hold_every_part_with_a_limit(facts: Facts) -> Iterator[Fault]:
    if not facts.told("parts"):
        return
    wanted: dict[tuple[str, str], set[str]] = {}
    for number, kind in facts.numbers.items():
        wanted.setdefault((kind.engine_type, kind.module), set()).add(number)
    held: dict[str, set[str]] = {}
    for _, number, module_serial in facts.records["parts"].pick("part_number", "module_serial"):
        if module_serial:
            held.setdefault(module_serial, set()).add(number)
    for serial, module in facts.modules.items():
        missing = wanted.get((module.engine_type, module.module), set()) - held.get(serial, set())
        if missing and module.engine_serial:
            names = ", ".join(sorted(missing))
            message = f"{serial} has no part of number {names}; no life is followed for it, add the part"
            yield Fault("modules", module.row, "module_serial", names, "every part number of the module", message)


def _mates(facts: Facts) -> Mates:
    names = ("engine_type", "module", "standard", "mates_with_module", "mates_with_standard")
    rows = (r[1:] for r in facts.records["standards"].pick(*names) if None not in r)
    return mates_of(Standard(**dict(zip(names, row, strict=True))) for row in rows)


def _neighbours(facts: Facts, engine: str, besides: str = "") -> list[tuple[str, str]]:
    found = (facts.modules[serial] for serial in facts.modules_of.get(engine, ()))
    return [(module.module, module.standard) for module in found if module.module != besides]


def modules_mate_with_their_neighbours(facts: Facts) -> Iterator[Fault]:
    mates = _mates(facts)
    for serial, module in facts.modules.items():
        if not module.engine_serial or not mates:
            continue
        for other, standard in _neighbours(facts, module.engine_serial, module.module):
            # the pair's other direction is looked at from the neighbour, so each is told once
            allowed = mates.get((module.engine_type, module.module, other))
            if allowed is None or (module.standard, standard) in allowed:
                continue
            message = (
                f"{serial} of standard {module.standard or 'blank'} does not mate with the {other} of standard "
                f"{standard or 'blank'} in engine {module.engine_serial}; mend a standard, or add the pair to standards"
            )
            yield Fault("modules", module.row, "standard", module.standard, "standards that mate", message)


def spare_modules_mate_with_every_engine(facts: Facts) -> Iterator[Fault]:
    mates = _mates(facts)
    for serial, module in facts.modules.items():
        if module.engine_serial or not mates:
            continue
        engines = [e for e, fact in facts.engines.items() if fact.engine_type == module.engine_type]
        odd = [
            engine
            for engine in engines
            if mismatch(module.engine_type, module.module, module.standard, _neighbours(facts, engine), mates)
        ]
        if odd:
            shown = ", ".join(odd[:4]) + (" …" if len(odd) > 4 else "")
            message = (
                f"{serial} of standard {module.standard or 'blank'} does not mate with {len(odd)} of {len(engines)} "
                f"engines ({shown}); it is offered to the others only"
            )
            yield Fault("modules", module.row, "standard", module.standard, "a standard that mates", message)


def what_lies_in_a_shop_names_it(facts: Facts) -> Iterator[Fault]:
    for table, key in (("engines", "engine_serial"), ("modules", "module_serial")):
        for row, serial, place, shop in facts.records[table].pick(key, "place", "shop"):
            if place == "shop" and not shop:
                message = f"{serial} is in a shop that is not named; its ready date holds, blank means ready today"
                yield Fault(table, row, "shop", "blank", "a shop", message)


PLACE_RULES: tuple[Rule, ...] = (
    stops(engine_positions_hold_one_engine),
    stops(engines_on_a_wing_name_tail_and_position),
    stops(positions_exist_on_the_aircraft),
    stops(engines_are_of_the_type_of_their_aircraft),
    warns(aircraft_have_an_engine_in_every_position),
    stops(modules_are_in_one_place),
    stops(parts_are_in_one_place),
    stops(engines_hold_each_module_once),
    stops(engines_are_complete),
    stops(modules_are_of_the_type_of_their_engine),
    stops(parts_belong_in_their_module),
    warns(modules_hold_every_part_with_a_limit),
    stops(modules_mate_with_their_neighbours),
    warns(spare_modules_mate_with_every_engine),
    warns(what_lies_in_a_shop_names_it),
)
