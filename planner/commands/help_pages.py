"""The text of planner/COMMANDS.md, from the commands' own help; a test compares the two."""

from __future__ import annotations

import importlib.util

import click

from planner.cli import COMMANDS, frame

_HEAD = """# The commands

Every command takes the fleet's folder or workbook first, prints a table to read, and takes `--json` where it answers a
question: then it prints one object for machines. Exit code 0: done; 1: the records or the request are at fault, and the
message says where and what to do; 2: wrong usage. Data goes to standard output, progress and messages to standard
error. This page is made from the commands' own help.
"""


def commands_text() -> str:
    """Return the whole page: every command that is installed, with its options."""
    parts = [_HEAD]
    for name, purpose in COMMANDS.items():
        if importlib.util.find_spec(f"planner.commands.{name}") is None:
            continue
        command = frame.get_command(click.Context(frame), name)
        assert command is not None
        parts.append(f"## {name}\n\n{purpose}\n\n{_help(command, f'spoolwright {name}')}")
        if isinstance(command, click.Group):
            parts += [
                f"### {name} {child}\n\n{_help(held, f'spoolwright {name} {child}')}"
                for child, held in command.commands.items()
            ]
    return "\n".join(parts)


def _help(command: click.Command, called: str) -> str:
    # a command keeps the help option that it was first asked with, so it is asked as the frame asks
    names = frame.context_settings["help_option_names"]
    with click.Context(
        command, info_name=called, terminal_width=100, max_content_width=100, help_option_names=names
    ) as context:
        lines = [line.rstrip() for line in command.get_help(context).splitlines()]
    return "```text\n" + "\n".join(lines) + "\n```\n"
