"""``spoolwright life``: what every life-limited part has left, and why."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path

import click


@click.command("life")
@click.argument("fleet", type=click.Path(path_type=Path))
@click.option("--tail", help="Only the engines on this aircraft.")
@click.option("--engine", help="Only this engine serial.")
@click.option("--at", type=click.DateTime(formats=["%Y-%m-%d"]), help="On this day, flown as planned until then.")
@click.option("--directives", is_flag=True, help="Who is hit by each directive, when, and the value of life lost.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def command(
    fleet: Path, tail: str | None, engine: str | None, at: datetime | None, directives: bool, as_json: bool
) -> None:
    """Show what every part of the FLEET has left at the rating it flies at, and the parts that limit each engine.

    Life is counted exactly over the ratings flown and rounded down; unknown life is zero. Off a tail the least over the
    type's ratings holds.
    """
    from planner.commands.life_output import print_lives
    from planner.life import answer

    found = answer(fleet, tail=tail, engine=engine, at=at.date() if at else None)
    print_lives(found, directives=directives, every_part=bool(tail or engine), as_json=as_json)
