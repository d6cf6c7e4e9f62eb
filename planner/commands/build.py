"""``spoolwright build``: what to replace and restore while an engine is open."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("build")
@click.argument("fleet", type=click.Path(path_type=Path))
@click.option("--engine", "engine_serial", required=True, help="Serial of the engine.")
@click.option(
    "--open-now/--fly-on",
    "open_now",
    default=None,
    help="Plan it as open today, or as flying on (default: open when it waits in a shop).",
)
@click.option("--years", type=float, default=6.0, show_default=True, help="Span of the plan, or to its return or exit.")
@click.option(
    "--limit", "limit_s", type=click.FloatRange(min=0.1), default=5.0, show_default=True, help="Seconds of search."
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def command(
    fleet: Path, engine_serial: str, open_now: bool | None, years: float, limit_s: float, as_json: bool
) -> None:
    """Plan one engine of the FLEET: which parts now, which later, which level for each module, which build goal."""
    from planner.commands.build_output import print_build

    print_build(fleet, engine_serial, open_now=open_now, years=years, limit_s=limit_s, as_json=as_json)
