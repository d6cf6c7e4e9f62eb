"""``spoolwright engine``: a type's gas path, and what a point lost in each module costs in margin and fuel."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("engine")
@click.argument("fleet", type=click.Path(path_type=Path))
@click.option("--type", "engine_type", help="One engine type (default: all).")
@click.option("--spare", help="Serial of a spare module: what it would do on --engine.")
@click.option("--engine", "engine_serial", help="Serial of the engine that --spare would go on.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object.")
def command(fleet: Path, engine_type: str | None, spare: str | None, engine_serial: str | None, as_json: bool) -> None:
    """Show the gas path of the FLEET's engine types: stations, margin and fuel for a point lost in each module."""
    from planner.commands.engine_output import print_engine

    if (spare is None) != (engine_serial is None):
        raise click.UsageError("--spare and --engine belong together")
    print_engine(fleet, engine_type=engine_type, spare=spare, engine_serial=engine_serial, as_json=as_json)
