"""How answers about saved studies are printed."""

from __future__ import annotations

import sys
from collections.abc import Mapping, Sequence
from typing import Any

import click

from planner import saved as questions
from planner import store
from planner.commands.output import envelope, print_json, table_text
from planner.execute import where_from
from planner.home import home
from planner.schema.registry import OUTPUTS

MOST_LINES = 40


def print_list(*, as_json: bool) -> None:
    """Print the saved studies, newest first."""
    lines = [questions.line_of(manifest) for manifest in store.studies(home())]
    if as_json:
        print_json(envelope("runs", {"studies": lines}, inputs=""))
    elif lines:
        click.echo(_table("studies", [{**line._asdict(), "inputs": line.inputs[:12]} for line in lines]))
    else:
        click.echo(f"no study is saved in {home()}")


def print_study(name: str, *, again: bool, workers: int | None, as_json: bool) -> None:
    """Print one study; with ``again``, end with code 1 when it does not come out the same."""
    study = store.load(home(), name)
    manifest = study.manifest
    found = _again(study, workers) if again else None
    result: dict[str, Any] = {"study": questions.line_of(manifest), "settings": manifest.settings, **manifest.summary}
    if found is not None:
        result["again"] = found
    if as_json:
        inputs, warnings = manifest.inputs, [*manifest.warnings, *([found.note] if found and found.note else [])]
        print_json(envelope("runs", result, inputs=inputs, warnings=warnings, seed=manifest.seed))
    else:
        facts = {**manifest.settings, **questions.line_of(manifest)._asdict()}
        click.echo("\n".join(f"{name}: {value}" for name, value in facts.items()))
        for warning in manifest.warnings:
            click.echo(f"Assumed: {warning}")
        for title, value in manifest.summary.items():
            click.echo(f"\n{title}\n{_summary(title, value)}")
        if found is not None:
            click.echo(f"\n{_in_words(found)}")
    if found is not None and not found.same:
        sys.exit(1)


def print_comparison(first: str, second: str, *, as_json: bool) -> None:
    """Print in what two studies differ."""
    one, other = store.load(home(), first), store.load(home(), second)
    settings = questions.settings_that_differ(one, other)
    totals = questions.compare_totals(one, other)
    if as_json:
        result = {"settings": settings, "totals": totals}
        print_json(envelope("runs", result, inputs=one.manifest.inputs, seed=one.manifest.seed))
        return
    click.echo(
        _table("study_settings", [line._asdict() for line in settings]) if settings else "nothing differs in them"
    )
    click.echo("\nTotal cost, first less second")
    click.echo(_table("study_totals", [line._asdict() for line in totals]) if totals else "no strategy is in both")


def _again(study: store.Saved, workers: int | None) -> questions.Again:
    from planner.study import recompute

    where = where_from(workers, None)
    return questions.again(study, recompute=lambda *asked: recompute(*asked, where=where))


def _in_words(found: questions.Again) -> str:
    if found.same:
        text = f"Computed anew: all {found.rows} rows are the same to the last digit."
    else:
        text = f"Computed anew: NOT the same, first at {found.first_difference} ({found.rows} rows before it are)."
    return f"{text} {found.note}".rstrip()


def _summary(title: str, value: object) -> str:
    """Return a part of an answer: sentences and short tables as they are, long tables by their size."""
    if not isinstance(value, Sequence) or isinstance(value, str):
        return str(value)
    if not value or not isinstance(value[0], Mapping):
        return "\n".join(str(item) for item in value)
    if len(value) > MOST_LINES:
        return f"{len(value)} rows: see them with --json"
    return _table(title, value)


def _table(name: str, rows: Sequence[Mapping[str, Any]]) -> str:
    """Return rows as a table under the headings of the schema, or under their own keys where it has none."""
    columns = {column.name: column for column in OUTPUTS[name].columns} if name in OUTPUTS else {}
    keys = list(rows[0])
    headings = [columns[key].heading if key in columns else key for key in keys]
    right = [at for at, key in enumerate(keys) if isinstance(rows[0][key], (int, float))]
    return table_text(headings, [[_cell(row.get(key)) for key in keys] for row in rows], right=right)


def _cell(value: object) -> str:
    if isinstance(value, float):
        return f"{value:,.2f}" if abs(value) < 1000 else f"{value:,.0f}"
    return "" if value is None else str(value)
