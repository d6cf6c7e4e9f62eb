"""``spoolwright forecast``: the removals ahead, with their causes and dates."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click


@click.command("forecast")
@click.argument("fleet", type=click.Path(path_type=Path))
@click.option("--strategy", default="", help="How the fleet works (default: the first row of strategies).")
@click.option("--months", type=int, default=60, show_default=True, help="Months ahead.")
@click.option("--runs", type=int, default=0, show_default=True, help="Runs to simulate beside the formulas (0: none).")
@click.option("--seed", type=click.IntRange(min=0), default=1, show_default=True, help="Seed of the luck.")
@click.option("--workers", type=click.IntRange(min=1), help="Processes to use (default: all cores).")
@click.option("--cluster", help="Address of a Dask scheduler, or 'local'.")
@click.option("--effects/--no-effects", default=True, help="Show what utilisation, derate and base do.")
@click.option("--engine", default="", help="An engine: how long would it last on --tail, and what ends it?")
@click.option("--tail", default="", help="The tail for --engine.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def command(**asked: Any) -> None:
    """List the removals ahead of the FLEET (a folder or workbook): engines, months, spares and shop slots."""
    from planner.commands.forecast_output import print_forecast

    print_forecast(asked)
