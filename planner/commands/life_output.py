"""How the answer of ``life`` is printed."""

from __future__ import annotations

from collections.abc import Sequence

import click

from planner.commands.output import envelope, footer, print_json, table_text
from planner.directives import DirectiveLife
from planner.life import EngineLife, Lives, PartLife
from planner.whose import Elsewhere

_NEAREST = 20


def print_lives(lives: Lives, *, directives: bool, every_part: bool, as_json: bool) -> None:
    """Print engines and parts (all of them, or those nearest to a limit), or who is hit by directives."""
    if as_json:
        result = {
            "at": lives.at,
            "parts": lives.parts,
            "engines": lives.engines,
            "directives": lives.directives,
            "places": lives.places,
        }
        print_json(envelope("life", result, inputs=lives.inputs, warnings=lives.assumptions))
        return
    lines = ["DEMO: an invented fleet"] if lives.demo else []
    lines.append(f"Life left on {lives.at}, counted exactly and rounded down. At a limit the answer is stop.\n")
    if directives:
        lines.append(_directives(lives.directives))
    else:
        shown = lives.parts if every_part else lives.parts[:_NEAREST]
        title = "Parts" if every_part else f"Parts nearest to a limit ({len(shown)} of {len(lives.parts):,})"
        lines += ["Engines, weakest first", _engines(lives.engines), "", title, _parts(shown), ""]
        if lives.places:
            lines += ["In another owner's assembly", _places(lives.places), ""]
        unknown = sum(not part.life_known for part in lives.parts)
        if unknown:
            lines.append(f"{unknown} part(s) without a known life: counted as zero.")
    lines.append(footer(lives.assumptions, inputs=lives.inputs))
    click.echo("\n".join(lines))


def _engines(rows: Sequence[EngineLife]) -> str:
    headings = ("Engine", "Tail", "Rating", "Cycles left", "State", "Date reached", "Limiting part", "Next two")
    cells = [
        (
            row.engine_serial,
            row.tail or "-",
            row.rating,
            f"{row.cycles_left:,}",
            row.state,
            row.date_reached or "-",
            row.limiting_part_serial or "no part recorded",
            ", ".join(
                f"{serial} ({left:,})"
                for serial, left in (
                    (row.second_part_serial, row.second_cycles_left),
                    (row.third_part_serial, row.third_cycles_left),
                )
                if left is not None
            ),
        )
        for row in rows
    ]
    return table_text(headings, cells, right=[3])


def _parts(rows: Sequence[PartLife]) -> str:
    headings = (
        "Part",
        "Number",
        "Engine",
        "Tail",
        "Flown (rating cycles)",
        "At",
        "Limit",
        "Used",
        "Left",
        "State",
        "Date reached",
        "Value left USD",
        "Limit's source",
    )
    cells = [
        (
            row.part_serial,
            row.part_number,
            row.engine_serial or "-",
            row.tail or "-",
            row.cycles_by_rating,
            row.rating,
            f"{row.limit_cycles:,}",
            f"{row.used_frac:.1%}",
            f"{row.cycles_left:,}" + _other_clocks(row),
            row.state,
            row.date_reached or "-",
            f"{row.value_left_usd:,.0f}",
            row.limit_source,
        )
        for row in rows
    ]
    return table_text(headings, cells, right=[6, 7, 8, 11])


def _other_clocks(row: PartLife) -> str:
    hours = "" if row.hours_left is None else f", {int(row.hours_left):,} h"
    return hours + ("" if row.days_left is None else f", {int(row.days_left):,} days")


def _directives(rows: Sequence[DirectiveLife]) -> str:
    if not rows:
        return "No directive of the records hits a part of this fleet.\n"
    headings = ("Directive", "From", "Part", "Engine", "Tail", "At", "Limit", "Left", "Must be off", "Life lost USD")
    cells = [
        (
            row.directive,
            row.valid_from or "always",
            row.part_serial,
            row.engine_serial or "-",
            row.tail or "-",
            row.rating,
            f"{row.limit_before_cycles:,} -> {row.limit_after_cycles:,}",
            f"{row.cycles_left_before:,} -> {row.cycles_left_after:,}",
            f"{row.date_reached or '-'}" + (" (over on its first day)" if row.over_on_day_one else ""),
            f"{row.value_lost_usd:,.0f}",
        )
        for row in rows
    ]
    total = sum(row.value_lost_usd for row in rows)
    lost = f"\n{len(rows)} part(s) hit; life worth {total:,.0f} USD at list prices is lost.\n"
    return table_text(headings, cells, right=[6, 7, 9]) + lost


def _places(rows: Sequence[Elsewhere]) -> str:
    headings = ("Serial", "Owner", "Is in", "Owner there", "Place", "Due back by")
    cells = [
        (r.serial, r.owner, r.flies_on, r.flies_on_owner, r.place, r.due_back or "no return is known") for r in rows
    ]
    return table_text(headings, cells)
