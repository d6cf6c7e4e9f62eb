"""The command line's frame: which commands there are, and what a user's error becomes.

Commands load when they are called, so that ``--help`` costs no library.
"""

from __future__ import annotations

import importlib
import sys
from pathlib import Path

import click

from sim.errors import UserError

COMMANDS: dict[str, str] = {
    "check": "Read a fleet's records and list everything that is wrong in them.",
    "life": "Show what every life-limited part has left, and why.",
    "engine": "Show a type's gas path: margin and fuel for a point lost in each module.",
    "fit": "Fit margin trends and hazards to the fleet's own records.",
    "forecast": "List the removals ahead, with their causes and dates.",
    "compare": "Simulate the fleet under each strategy and compare cost and downtime.",
    "holdings": "Find how many spare engines and modules to hold, and where.",
    "swaps": "Plan which module, engine and slot go where.",
    "build": "Plan what to replace and restore while an engine is open.",
    "lease": "Show each lease return: conditions, money and the cheapest cure.",
    "report": "Write a self-contained report of an answer.",
    "runs": "List, show, compare, export or delete saved studies.",
    "demo": "Write an invented demonstration fleet.",
    "template": "Write blank tables, or turn a folder into a workbook and back.",
    "serve": "Open the browser screen on this machine.",
}


def installed() -> list[str]:
    """Return the commands that this version has, in the order of COMMANDS."""
    here = Path(__file__).parent / "commands"
    return [name for name in COMMANDS if (here / f"{name}.py").is_file()]


class _Frame(click.Group):
    """A group whose commands are imported when they are called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return installed()

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in installed():
            return None
        module = importlib.import_module(f"planner.commands.{cmd_name}")
        command: click.Command = module.command
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl([(name, COMMANDS[name]) for name in installed()])


@click.command(cls=_Frame, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="spoolwright", prog_name="spoolwright")
def frame() -> None:
    """Plan a fleet of modular turbofans: life, wear, shop visits, spares and lease returns.

    Every command takes the fleet's folder or workbook first. A planning aid only: approved limits, manuals, directives
    and licensed practice prevail.
    """


def main(arguments: list[str] | None = None) -> None:
    """Run one command; end with 0 done, 1 the user's data or request is at fault, 2 wrong usage."""
    try:
        frame.main(args=arguments, prog_name="spoolwright", standalone_mode=True)
    except UserError as error:
        click.echo(f"spoolwright: {error}", err=True)
        sys.exit(1)
    except BrokenPipeError:
        sys.exit(0)


if __name__ == "__main__":
    main()
