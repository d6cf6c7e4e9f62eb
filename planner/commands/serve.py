"""``spoolwright serve``: open the browser screen on this machine."""

from __future__ import annotations

from pathlib import Path

import click


@click.command("serve")
@click.argument("fleet", type=click.Path(path_type=Path))
@click.option("--port", type=click.IntRange(1024, 65535), default=8501, show_default=True, help="Port on loopback.")
def command(fleet: Path, port: int) -> None:
    """Open the screen for the FLEET on loopback; nothing leaves this machine. Ctrl-C ends it."""
    from planner.serving import serve

    serve(fleet, port=port)
