"""Compare from records to answer: read, run, save; what the command line and the runner of the screen both call."""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, NamedTuple

from planner import fingerprint
from planner.assemble import load
from planner.compare import Comparison, comparison
from planner.errors import SavedRunsError
from planner.execute import Where
from planner.execute_tally import Listener
from planner.home import home as default_home
from planner.identity import identity
from planner.manifest import Manifest
from planner.sequential import Verdict
from planner.store import save
from planner.study import CompareRequest, Study, from_settings, run_study, to_settings


class Answered(NamedTuple):
    """A comparison with what went in and the name under which it was saved (None: not saved)."""

    comparison: Comparison
    study: Study
    inputs: str
    saved: str | None
    warnings: tuple[str, ...]


def compare(
    path: Path,
    request: CompareRequest,
    *,
    where: Where,
    saving: bool = True,
    progress: Listener | None = None,
    cancelled: Callable[[], bool] = lambda: False,
    notice: Callable[[str], None] = lambda text: None,
    look_at: Callable[[int, Verdict], None] = lambda runs, verdict: None,
) -> Answered:
    """Read a fleet, run the study, and save it unless told not to; a store that cannot be written is a warning, since
    the answer is worth more than its copy."""
    fleet = load(path)
    contents = fingerprint.tables_of(path)
    inputs = fingerprint.files(contents)
    home = default_home() if saving else None
    study = run_study(
        fleet,
        request,
        where=where,
        home=home,
        progress=progress,
        cancelled=cancelled,
        notice=notice,
        look_at=look_at,
    )
    answer = comparison(study)
    saved: str | None = None
    extra: tuple[str, ...] = ()
    if home is not None and study.runs:
        try:
            saved = save(home, _manifest(study, answer, inputs), inputs=contents, rows=_by_task(study))
        except SavedRunsError as error:
            extra = (f"the study was not saved: {error}",)
    return Answered(answer, study, inputs, saved, (*answer.warnings, *extra))


def _manifest(study: Study, answer: Comparison, inputs: str) -> Manifest:
    me = identity()
    return Manifest(
        command="compare",
        version=me.version,
        sources=me.sources,
        probe=me.probe,
        inputs=inputs,
        seed=study.request.seed,
        strategies=tuple(study.rows),
        settings=to_settings(study.request),
        runs=study.runs,
        finished=study.verdict.reason != "cancelled",
        made_at=datetime.now(UTC).isoformat(timespec="seconds"),
        warnings=answer.warnings,
        summary=answer.as_result(),
    )


def _by_task(study: Study) -> dict[tuple[Any, ...], Any]:
    return {(name, run): row for name, rows in study.rows.items() for run, row in enumerate(rows)}


def answer(
    request: dict[str, Any],
    *,
    progress: Listener,
    cancelled: Callable[[], bool],
    notice: Callable[[str], None],
    note: Callable[[dict[str, Any]], None],
) -> dict[str, Any]:
    """Answer a request of the screen: ``{"command": "compare", "fleet": path, ...fields of CompareRequest}``."""

    def look_at(runs: int, verdict: Verdict) -> None:
        note(
            {
                "runs": runs,
                "pairs": [
                    {"a": a, "b": b, "mean": one.mean, "low": one.low, "high": one.high}
                    for (a, b), one in verdict.pairs.items()
                ],
            }
        )

    asked = {key: value for key, value in request.items() if key not in ("command", "fleet", "saving")}
    done = compare(
        Path(request["fleet"]),
        from_settings(asked),
        where=Where(),
        saving=request.get("saving", True),
        progress=progress,
        cancelled=cancelled,
        notice=notice,
        look_at=look_at,
    )
    return {
        "study": done.saved,
        "inputs": done.inputs,
        "seed": done.study.request.seed,
        "version": identity().version,
        "warnings": list(done.warnings),
        "result": done.comparison.as_result(),
    }
