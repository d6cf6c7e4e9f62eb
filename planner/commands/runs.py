"""Saved studies: list, show, compare, export, delete."""

from __future__ import annotations

from pathlib import Path

import click


@click.group(name="runs")
def command() -> None:
    """List, show, compare, export or delete saved studies.

    They lie in $SPOOLWRIGHT_HOME, else in the user's data folder. A study may be named by the first digits of its name.
    """


@command.command("list")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def list_studies(as_json: bool) -> None:
    """List the saved studies, newest first."""
    from planner.commands.runs_output import print_list

    print_list(as_json=as_json)


@command.command("show")
@click.argument("study")
@click.option("--again", is_flag=True, help="Compute it anew from its own snapshot and compare to the last digit.")
@click.option("--workers", type=int, default=None, help="Processes to compute on (default: every core).")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def show(study: str, again: bool, workers: int | None, as_json: bool) -> None:
    """Show what went into a saved study and what came out."""
    from planner.commands.runs_output import print_study

    print_study(study, again=again, workers=workers, as_json=as_json)


@command.command("compare")
@click.argument("first")
@click.argument("second")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def compare(first: str, second: str, as_json: bool) -> None:
    """Compare two saved studies: what differs in what went in, and in total cost."""
    from planner.commands.runs_output import print_comparison

    print_comparison(first, second, as_json=as_json)


@command.command("export")
@click.argument("study")
@click.argument("target", type=click.Path(path_type=Path))
def export(study: str, target: Path) -> None:
    """Write a saved study to a new folder, or to an archive when TARGET ends in .zip, its tables as CSV too."""
    from planner.home import home
    from planner.saved_export import export as write
    from planner.store import load

    click.echo(f"written to {write(load(home(), study), target)}")


@command.command("delete")
@click.argument("studies", nargs=-1, required=True)
def delete(studies: tuple[str, ...]) -> None:
    """Delete saved studies."""
    from planner.home import home
    from planner.store import delete as remove

    for study in studies:
        click.echo(f"deleted {remove(home(), study)}")
