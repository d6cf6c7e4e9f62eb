"""How the answer of ``check`` is printed."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

import click

from planner.changes import Change
from planner.checking import Checked
from planner.commands.output import envelope, footer, print_json
from planner.schema.record_outputs import CHANGE_KINDS

_MOST_LINES = 60


def print_checked(checked: Checked, *, as_json: bool) -> None:
    """Print problems and changes; end with code 1 where a problem stops the work."""
    if as_json:
        result: dict[str, object] = {"problems": [problem._asdict() for problem in checked.problems]}
        if checked.moved is not None:
            result["changes"] = [change._asdict() for change in checked.moved]
        print_json(envelope("check", result, inputs=checked.inputs, warnings=checked.assumptions))
    else:
        click.echo("\n".join(_lines(checked)))
    if checked.stops:
        click.get_current_context().exit(1)


def _lines(checked: Checked) -> list[str]:
    lines = ["DEMO: an invented fleet"] if checked.demo else []
    for severity, title in (("stops", "Stops the work:"), ("warns", "Warnings, and what is assumed:")):
        found = [problem for problem in checked.problems if problem.severity == severity]
        if found:
            lines += [title, *(f"  {problem.sentence()} [{problem.rule}]" for problem in found), ""]
    if checked.moved is not None:
        lines += [*_changes(checked.moved), ""]
    stopping, warning = checked.count("stops"), checked.count("warns")
    if not checked.problems:
        lines.append("No problem found.")
    else:
        lines.append(
            f"{stopping} stop{'s' if stopping == 1 else ''} the work, {warning} warn{'s' if warning == 1 else ''}."
        )
    return [*lines, footer(checked.assumptions, inputs=checked.inputs)]


def _changes(moved: Sequence[Change]) -> list[str]:
    """Return the changes by kind; plain use is counted, the rest is listed."""
    if not moved:
        return ["Nothing moved between the two versions."]
    counts = Counter(change.what for change in moved)
    lines = ["Moved since the other version: " + ", ".join(f"{counts[k]} {k}" for k in CHANGE_KINDS if counts[k])]
    for kind in CHANGE_KINDS:
        listed = [change for change in moved if change.what == kind] if kind != "use" else []
        for change in listed[:_MOST_LINES]:
            column = f" {change.column}" if change.column else ""
            values = f" {change.before or 'blank'} -> {change.after or 'blank'}" if change.column else ""
            lines.append(f"  {kind}: {change.table} {change.key}{column}{values} ({change.note})")
        if len(listed) > _MOST_LINES:
            lines.append(f"  {kind}: {len(listed) - _MOST_LINES:,} more; --json lists all")
    return lines
