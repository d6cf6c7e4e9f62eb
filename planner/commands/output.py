"""How a command's answer is printed: a table to read, or one JSON object for machines."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Mapping, Sequence
from importlib.metadata import version
from typing import Any

import click

CAUTION = (
    "Planning aid only: approved limits, manuals, directives and licensed practice prevail; nothing here releases or "
    "extends anything. At a limit the answer is stop. Unknown history is no life."
)


def _plain(value: Any) -> Any:
    """Return a value that JSON can carry: no NaN, no numpy scalars, dates as ISO text."""
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if hasattr(value, "_asdict"):
        return _plain(value._asdict())
    if isinstance(value, (list, tuple, set, frozenset)):
        return [_plain(item) for item in value]
    if hasattr(value, "item") and not isinstance(value, (str, bytes)):
        value = value.item()
    if isinstance(value, float) and not math.isfinite(value):
        return None
    if hasattr(value, "isoformat"):
        return value.isoformat()
    return value


def envelope(
    command: str,
    result: Mapping[str, Any],
    *,
    inputs: str,
    warnings: Sequence[str] = (),
    seed: int | None = None,
    basis: str | None = None,
) -> dict[str, Any]:
    """Return the one object that ``--json`` prints; ``inputs`` is the fingerprint of the records."""
    body: dict[str, Any] = {"command": command, "version": version("spoolwright"), "inputs": inputs}
    if seed is not None:
        body["seed"] = seed
    if basis is not None:
        body["basis"] = basis
    body["caution"] = CAUTION
    body["warnings"] = list(warnings)
    body["result"] = _plain(result)
    return body


def print_json(body: Mapping[str, Any]) -> None:
    click.echo(json.dumps(body, ensure_ascii=False, indent=1, allow_nan=False))


def table_text(headings: Sequence[str], rows: Iterable[Sequence[object]], *, right: Iterable[int] = ()) -> str:
    """Return a plain table; columns whose number is in ``right`` are set flush right."""
    cells = [[("" if cell is None else str(cell)) for cell in row] for row in rows]
    widths = [max([len(heading), *(len(row[i]) for row in cells)]) for i, heading in enumerate(headings)]
    flush = set(right)

    def line(row: Sequence[str]) -> str:
        return "  ".join(
            text.rjust(width) if i in flush else text.ljust(width)
            for i, (text, width) in enumerate(zip(row, widths, strict=True))
        ).rstrip()

    rule = "  ".join("-" * width for width in widths)
    return "\n".join([line(list(headings)), rule, *(line(row) for row in cells)])


def footer(warnings: Sequence[str], *, inputs: str, seed: int | None = None) -> str:
    """Return what stands under every answer: assumptions, caution, and how to have the figures again."""
    lines = [f"Assumed: {warning}" for warning in warnings]
    lines.append(CAUTION)
    again = f"Version {version('spoolwright')}, inputs {inputs[:12]}"
    lines.append(again + (f", seed {seed}." if seed is not None else "."))
    return "\n".join(lines)
