"""A study: strategies times runs under common luck, run where it is told, stopped by its rule, kept and saved."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import asdict, dataclass, field, replace
from pathlib import Path
from typing import Any, NamedTuple

from planner import fingerprint
from planner.execute import Where, execute
from planner.execute_tally import Listener
from planner.job import RunRow, Scenario, run_job
from planner.kept import Kept
from planner.scenario import WhatIf, apply, same_money, with_stock
from planner.sequential import Verdict
from planner.until_enough import Stop, run_until_enough
from sim.errors import RequestError
from sim.fleet import Fleet, Holding

SWEEP_YEARS = (5.0, 10.0, 15.0, 20.0)
DAYS_PER_YEAR = 365.25


@dataclass(frozen=True, slots=True, kw_only=True)
class CompareRequest:
    """What is asked of ``compare``.

    ``strategies``: names, in the order of the differences (empty: all). ``runs``: a fixed number, or None for the
    stopping rule with ``precision_frac`` of total cost. ``stock_of``: stock for one strategy alone, by name.
    ``sweep``: value every horizon of SWEEP_YEARS up to 20 years instead of those inside the horizon.
    """

    strategies: tuple[str, ...] = ()
    runs: int | None = None
    precision_frac: float = 0.01
    seed: int = 1
    what_if: WhatIf = field(default_factory=WhatIf)
    same_money: bool = False
    stock_of: tuple[tuple[str, tuple[Holding, ...]], ...] = ()
    sweep: bool = False


class Study(NamedTuple):
    """What a study left: rows by strategy in run order, why it stopped, and what went in."""

    request: CompareRequest
    scenarios: dict[str, Scenario]
    rows: dict[str, list[RunRow]]
    verdict: Verdict
    runs: int
    kept_runs: int
    sweep_years: tuple[float, ...]


def job(payload: Mapping[str, Scenario], strategy: str, run: int) -> RunRow:
    """Run one strategy of a study; what workers import."""
    return run_job(payload[strategy], strategy, run)


def scenarios(fleet: Fleet, request: CompareRequest) -> tuple[dict[str, Scenario], tuple[float, ...]]:
    """Return the scenario of each strategy asked for, and the horizons (years) that are valued.

    Raises RequestError for an unknown strategy or impossible what-if.
    """
    known = {s.strategy: s for s in fleet.strategies}
    asked = request.strategies or tuple(known)
    for name in asked:
        if name not in known:
            raise RequestError("--strategy", name, f"one of {', '.join(known)}", "or add it to strategies.csv")
    if len(set(asked)) != len(asked):
        raise RequestError("--strategy", ", ".join(asked), "each strategy once")
    changed = apply(fleet, request.what_if)
    years = changed.settings.horizon_years
    if request.sweep:
        years = max(SWEEP_YEARS[-1], years)
        changed = replace(changed, settings=replace(changed.settings, horizon_years=years))
    inner = tuple(y for y in SWEEP_YEARS if y < years)
    stock_of = dict(request.stock_of)
    result = {}
    for name in asked:
        own = with_stock(changed, same_money(changed, known[name])) if request.same_money else changed
        own = with_stock(own, stock_of.get(name, ()))
        result[name] = Scenario(
            fleet=own,
            horizon_days=years * DAYS_PER_YEAR,
            seed=request.seed,
            sweep_days=tuple(y * DAYS_PER_YEAR for y in inner),
        )
    return result, (*inner, years)


def run_study(
    fleet: Fleet,
    request: CompareRequest,
    *,
    where: Where,
    home: Path | None = None,
    progress: Listener | None = None,
    cancelled: Callable[[], bool] = lambda: False,
    notice: Callable[[str], None] = lambda text: None,
    look_at: Callable[[int, Verdict], None] = lambda runs, verdict: None,
) -> Study:
    """Run a study. ``home``: where runs are kept by content (None: neither read nor written)."""
    found, years = scenarios(fleet, request)
    stop = Stop(runs=request.runs, precision_frac=request.precision_frac)
    options: dict[str, Any] = {"progress": progress, "cancelled": cancelled, "notice": notice, "look_at": look_at}
    names = tuple(found)
    if home is None:
        outcome = run_until_enough(job, found, names, stop=stop, where=where, **options)
        return Study(request, found, outcome.rows, outcome.verdict, outcome.runs, 0, years)
    with Kept(home, keys(found), RunRow) as kept:
        before = kept.count()
        outcome = run_until_enough(job, found, names, stop=stop, where=where, kept=kept, **options)
    return Study(request, found, outcome.rows, outcome.verdict, outcome.runs, before, years)


def keys(found: Mapping[str, Scenario]) -> dict[str, str]:
    """Return what names a strategy's runs: all that went in, its own row of strategies only, and the sources. So a
    what-if that changes one strategy finds the runs of the others."""
    result = {}
    for name, scenario in found.items():
        own = tuple(s for s in scenario.fleet.strategies if s.strategy == name)
        result[name] = fingerprint.of(
            replace(scenario, fleet=replace(scenario.fleet, strategies=own)), fingerprint.sources()
        )
    return result


def to_settings(request: CompareRequest) -> dict[str, Any]:
    """Return a request as plain JSON values, from which ``from_settings`` makes it again."""
    return asdict(request)


def from_settings(settings: Mapping[str, Any]) -> CompareRequest:
    """Return the request that ``to_settings`` wrote (or that a screen made)."""
    given = dict(settings)
    what_if = dict(given.get("what_if") or {})
    what_if["stock"] = tuple(Holding(**row) for row in what_if.get("stock", ()))
    given["what_if"] = WhatIf(**what_if)
    given["strategies"] = tuple(given.get("strategies", ()))
    given["stock_of"] = tuple((name, tuple(Holding(**row) for row in rows)) for name, rows in given.get("stock_of", ()))
    return CompareRequest(**given)


def recompute(
    inputs: Path, settings: dict[str, Any], tasks: Sequence[tuple[Any, ...]], *, where: Where
) -> Iterator[tuple[tuple[Any, ...], RunRow]]:
    """Yield the rows of a saved study computed anew from its snapshot of inputs."""
    from planner.assemble import load

    files = [path for path in inputs.iterdir() if path.is_file()]
    source = files[0] if len(files) == 1 and files[0].suffix.lower() == ".xlsx" else inputs
    found, _ = scenarios(load(source), from_settings(settings))
    yield from execute(job, found, tasks, where=where)
