"""``spoolwright compare``: simulate the fleet under each strategy and compare cost and downtime."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click


@click.command("compare")
@click.argument("fleet", type=click.Path(path_type=Path))
@click.option(
    "--strategy", "strategies", multiple=True, help="Name of a strategy; give it again for more (default: all)."
)
@click.option("--runs", type=click.IntRange(min=None), help="A fixed number of runs instead of the stopping rule.")
@click.option(
    "--precision", type=float, default=0.01, show_default=True, help="Half-width asked, as a share of total cost."
)
@click.option("--seed", type=click.IntRange(min=0), default=1, show_default=True, help="Seed of the luck.")
@click.option("--workers", type=click.IntRange(min=1), help="Processes to use (default: all cores).")
@click.option("--cluster", help="Address of a Dask scheduler, or 'local'.")
@click.option("--horizon", type=float, help="Years to simulate (default: the fleet's setting).")
@click.option("--sweep", is_flag=True, help="Value 5, 10, 15 and 20 years, simulating the longest.")
@click.option("--same-money", is_flag=True, help="Give each strategy the same money in spares.")
@click.option(
    "--holding",
    "holdings",
    multiple=True,
    metavar="[STRATEGY:]TYPE:ITEM=N",
    help="Hold N spares of an item ('engine' or a module), for all strategies or one.",
)
@click.option("--build-goal", type=int, help="Build goal in cycles, for all strategies.")
@click.option("--turn-time-factor", type=float, default=1.0, show_default=True, help="Factor on every turn time.")
@click.option("--fuel-price", type=float, help="Jet fuel, USD/kg.")
@click.option("--story", metavar="SERIAL", help="Print the history of one engine, module, part or tail in run 0.")
@click.option("--no-save", is_flag=True, help="Neither read nor write saved runs.")
@click.option(
    "--resume", is_flag=True, help="Go on with an interrupted study (kept runs are always used; says how many)."
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def command(**asked: Any) -> None:
    """Compare strategies on the FLEET (a folder or workbook): cost, downtime, and whether the runs suffice."""
    from planner.commands.compare_output import print_comparison, print_story
    from planner.comparing import ask

    if asked["story"]:
        print_story(asked)
        return
    print_comparison(ask(asked), as_json=asked["as_json"], fleet=asked["fleet"])
