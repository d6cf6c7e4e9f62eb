"""``spoolwright template``: blank tables, or a fleet in the other form."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("template")
@click.argument("target", type=click.Path(path_type=Path))
@click.option("--from", "source", type=click.Path(path_type=Path), help="A fleet to write in this form.")
def command(target: Path, source: Path | None) -> None:
    """Write blank tables with one example row to TARGET: a new folder, or a workbook where its name ends in .xlsx.

    With --from, write the tables of a folder as a workbook or the other way round, to the last character.
    """
    from planner.template import write

    count = write(target, source)
    click.echo(f"{count} tables are in {target}")
