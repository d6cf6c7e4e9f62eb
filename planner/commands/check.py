"""``spoolwright check``: everything that is wrong in a fleet's records."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("check")
@click.argument("fleet", type=click.Path(path_type=Path))
@click.option("--against", type=click.Path(path_type=Path), help="Another version of the records: tell what moved.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def command(fleet: Path, against: Path | None, as_json: bool) -> None:
    """List everything that is wrong in the FLEET (a folder or workbook): file, row, column, found, expected, remedy.

    A problem stops the work (exit code 1) or warns and says what is assumed. Each is named by the rule that found it.
    """
    from planner.checking import answer
    from planner.commands.check_output import print_checked

    print_checked(answer(fleet, against), as_json=as_json)
