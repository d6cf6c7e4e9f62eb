"""``spoolwright demo``: write an invented fleet."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("demo")
@click.argument("folder", type=click.Path(path_type=Path))
@click.option(
    "--aircraft", type=click.IntRange(1, 5000), default=40, show_default=True, help="Aircraft that fly today."
)
@click.option("--seed", type=click.IntRange(min=0), default=7, show_default=True, help="Seed of the scenario.")
@click.option("--plain", is_flag=True, help="Without planted complications: records that give no problem at all.")
def command(folder: Path, aircraft: int, seed: int, plain: bool) -> None:
    """Write an invented fleet into FOLDER (new or empty). No real airline, engine, lessor or shop.

    For every 20 aircraft that fly today one more joins in 2028.
    """
    from planner.demo.make import make

    make(folder, aircraft=aircraft, seed=seed, plain=plain)
    click.echo(f"Wrote a DEMO fleet of {aircraft} aircraft (invented data) into {folder}.")
    click.echo(f"Next: spoolwright compare {folder}")
