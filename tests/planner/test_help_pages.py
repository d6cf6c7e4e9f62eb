"""planner/COMMANDS.md says what the commands' help says."""

from __future__ import annotations

from pathlib import Path

from planner.cli import COMMANDS
from planner.commands.help_pages import commands_text

PAGE = Path(__file__).resolve().parents[2] / "planner" / "COMMANDS.md"


def test_the_page_is_what_the_commands_say() -> None:
    remedy = "from planner.commands.help_pages import commands_text; print(commands_text(), end=str())"
    assert PAGE.read_text(encoding="utf-8") == commands_text(), (
        f'make it anew: python -c "{remedy}" > planner/COMMANDS.md'
    )


def test_the_page_names_commands_and_the_options_that_scripts_rely_on() -> None:
    text = commands_text()
    for name in ("check", "life", "template", "compare", "demo"):
        assert f"## {name}\n" in text
        assert COMMANDS[name] in text
    for option in ("--against", "--tail", "--engine", "--at", "--directives", "--json", "--precision", "--plain"):
        assert option in text
