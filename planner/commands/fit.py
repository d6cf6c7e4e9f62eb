"""``spoolwright fit``: margin trends and hazards from the fleet's own records."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("fit")
@click.argument("fleet", type=click.Path(path_type=Path))
@click.option(
    "--write", "folder", type=click.Path(path_type=Path), help="Write hazards.csv and wear.csv into a folder."
)
@click.option("--engine", "engine_serial", help="Show the readings and the margin ahead of one engine.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def command(fleet: Path, folder: Path | None, engine_serial: str | None, as_json: bool) -> None:
    """Fit margins and hazards to the FLEET's own readings and removals, with intervals.

    Nothing of yours is changed: what --write writes are whole tables to copy into a fleet.
    """
    from planner.commands.fit_output import print_fit

    print_fit(fleet, folder=folder, engine_serial=engine_serial, as_json=as_json)
