"""Questions about saved studies: which there are, how two differ, whether one can be had again to the last digit."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import stdtrit

from planner import store
from planner.chunk import Task
from planner.fingerprint import of, tables_of
from planner.identity import identity
from planner.manifest import Manifest
from planner.rows import pack
from planner.sequential import ALLOWED_ERROR, paired_interval

TOTAL = "total_usd"
"""The figure of a row by which studies are compared."""

Recompute = Callable[[Path, dict[str, Any], list[Task]], Iterable[tuple[Task, Any]]]


class StudyLine(NamedTuple):
    """One saved study in a list; columns of the table ``studies``."""

    study: str
    made_at: str
    command: str
    strategies: str
    runs: int
    finished: str
    seed: int
    version: str
    inputs: str


class Setting(NamedTuple):
    """One thing in which two studies differ; columns of the table ``study_settings``."""

    what: str
    first: str
    second: str


class TotalLine(NamedTuple):
    """One strategy in two studies; columns of the table ``study_totals``."""

    strategy: str
    first_usd: float
    second_usd: float
    total_usd_mean: float
    total_usd_low: float
    total_usd_high: float
    same_luck: str


class Again(NamedTuple):
    """Whether a study computed anew is the one that was saved, and where it first is not."""

    same: bool
    rows: int
    first_difference: str
    note: str


def line_of(manifest: Manifest) -> StudyLine:
    """Return a study as one line of a list."""
    return StudyLine(
        study=manifest.id,
        made_at=manifest.made_at,
        command=manifest.command,
        strategies=" ".join(manifest.strategies),
        runs=manifest.runs,
        finished="yes" if manifest.finished else "no",
        seed=manifest.seed,
        version=manifest.version,
        inputs=manifest.inputs,
    )


def settings_that_differ(first: store.Saved, second: store.Saved) -> list[Setting]:
    """Return every setting, input table and part of the program in which two studies differ."""
    return [
        Setting(what, str(one), str(other))
        for what, one, other in _side_by_side(_facts(first), _facts(second))
        if one != other
    ]


def _facts(saved: store.Saved) -> dict[str, Any]:
    manifest = saved.manifest
    facts: dict[str, Any] = {
        name: getattr(manifest, name) for name in ("command", "version", "sources", "seed", "runs")
    }
    facts["strategies"] = " ".join(manifest.strategies)
    facts.update(manifest.settings)
    for name, content in tables_of(saved.folder / "inputs").items():
        lines = content.count(b"\n")
        facts[f"table {name}"] = f"{lines} lines, content {of(content)[:8]}"
    return facts


def _side_by_side(first: dict[str, Any], second: dict[str, Any]) -> Iterator[tuple[str, Any, Any]]:
    for what in [*first, *(name for name in second if name not in first)]:
        yield what, first.get(what, "not there"), second.get(what, "not there")


def compare_totals(first: store.Saved, second: store.Saved) -> list[TotalLine]:
    """Return the mean total cost of each shared strategy in both studies, and the difference with its interval.

    Under the same seed the studies met the same luck and are compared run by run; otherwise as independent samples
    (Welch, Biometrika 34, 1947).
    """
    one, other = _totals(first), _totals(second)
    same_luck = first.manifest.seed == second.manifest.seed
    lines = []
    for strategy in [name for name in one if name in other]:
        a, b = one[strategy], other[strategy]
        if same_luck:
            runs = sorted(set(a) & set(b))
            interval = paired_interval([a[run] for run in runs], [b[run] for run in runs])
            mean, low, high = interval.mean, interval.low, interval.high
        else:
            mean, low, high = _welch(np.array([*a.values()]), np.array([*b.values()]))
        means = (float(np.mean([*a.values()])), float(np.mean([*b.values()])))
        lines.append(TotalLine(strategy, *means, mean, low, high, "yes" if same_luck else "no"))
    return lines


def _totals(saved: store.Saved) -> dict[str, dict[int, float]]:
    """Return each strategy's total cost by run; nothing when the study's rows have no such figure."""
    table = saved.table("rows")
    if TOTAL not in table.column_names:
        return {}
    found: dict[str, dict[int, float]] = {}
    for strategy, run, total in zip(*(table[name].to_pylist() for name in ("strategy", "run", TOTAL)), strict=True):
        found.setdefault(strategy, {})[run] = total
    return found


def _welch(a: NDArray[np.float64], b: NDArray[np.float64]) -> tuple[float, float, float]:
    """Return mean difference and 95 % bounds for two independent samples."""
    mean = float(a.mean() - b.mean())
    if min(a.size, b.size) < 2:
        return mean, math.nan, math.nan
    shares = np.array([a.var(ddof=1) / a.size, b.var(ddof=1) / b.size])
    variance = float(shares.sum())
    if variance == 0.0:
        return mean, mean, mean
    freedom = variance**2 / float(shares[0] ** 2 / (a.size - 1) + shares[1] ** 2 / (b.size - 1))
    half = float(stdtrit(freedom, 1.0 - ALLOWED_ERROR / 2.0)) * math.sqrt(variance)
    return mean, mean - half, mean + half


def again(saved: store.Saved, *, recompute: Recompute) -> Again:
    """Compute a saved study anew from its own snapshot and compare every row to the last bit.

    ``recompute(inputs, settings, tasks)`` yields each task with its row.
    """
    manifest = saved.manifest
    kept = saved.packed()
    here = identity()
    note = ""
    if (manifest.version, manifest.sources) != (here.version, here.sources):
        note = f"saved by version {manifest.version} from other sources than these: figures may differ"
    elif manifest.probe != here.probe:
        note = "saved on a machine whose arithmetic gives other last digits: equal in statistics, not in every digit"
    compared = 0
    for task, row in recompute(saved.folder / "inputs", manifest.settings, list(kept)):
        if pack(row) != kept[task]:
            return Again(False, compared, f"strategy {task[0]}, run {task[1]}", note)
        compared += 1
    if compared != len(kept):
        return Again(False, compared, f"only {compared} of {len(kept)} rows came again", note)
    return Again(True, compared, "", note)
