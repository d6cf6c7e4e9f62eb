"""How the answer to ``build`` is printed."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from planner.build import BuildPlan, build
from planner.build_rows import actions, parts, remainder_usd, rules, spans
from planner.commands.output import envelope, footer, print_json
from planner.commands.plan_output import plan_table
from planner.plan_records import DEMO, read


def print_build(
    fleet: Path, engine_serial: str, *, open_now: bool | None, years: float, limit_s: float, as_json: bool
) -> None:
    """Print the build plan of one engine as tables or as one JSON object."""
    found = read(fleet)
    plan = build(found.fleet, engine_serial, open_now=open_now, years=years, limit_s=limit_s)
    warnings = tuple(dict.fromkeys((*found.warnings, *plan.warnings)))
    if as_json:
        print_json(envelope("build", result(plan), inputs=found.inputs, warnings=warnings, basis="consumption"))
    else:
        click.echo(_text(plan, warnings, found.inputs))


def result(plan: BuildPlan) -> dict[str, Any]:
    """Return the plan as the object that machines read."""
    return {
        "engine_serial": plan.planned.engine.serial,
        "tail": plan.planned.tail,
        "end": plan.planned.view.setup.season.date(plan.planned.end_day),
        "end_why": plan.planned.end_why,
        "build_goal_cycles": plan.build_goal_cycles,
        "objective_usd": plan.cost_usd,
        "bound_usd": min(plan.best.bound_usd, plan.cost_usd),
        "gap_frac": plan.best.gap_frac,
        "proven": plan.best.gap_frac <= 1e-6,
        "remainder_usd": remainder_usd(plan),
        "usd_per_cycle": plan.usd_per_cycle,
        "actions": actions(plan),
        "parts": parts(plan),
        "spans": spans(plan),
        "rules": rules(plan),
    }


def sentence(plan: BuildPlan) -> str:
    """Return the answer in words."""
    date = plan.planned.view.setup.season.date
    serial, tail = plan.planned.engine.serial, plan.planned.tail
    until = f"to its {plan.planned.end_why} on {date(plan.planned.end_day)}"
    if not plan.visits:
        return f"{serial} on {tail} flies {until} without an opening."
    first = plan.points[plan.visits[0]]
    restored = [plan.planned.problem.modules[m].module for m in range(plan.best.restored.shape[0])
                if plan.best.restored[m, plan.visits[0]]]  # fmt: skip
    replaced = sum(one.at == plan.visits[0] for one in plan.best.installs)
    text = f"{serial} on {tail} {until}: open it on {date(plan.planned.use.day(first))}, "
    text += f"restore {', '.join(restored) or 'nothing'}, replace {replaced} part{'s' if replaced != 1 else ''}, "
    text += f"and build it for {plan.build_goal_cycles:,} cycles; {len(plan.visits)} opening"
    text += f"{'s' if len(plan.visits) != 1 else ''} in all, {plan.usd_per_cycle:,.0f} USD a cycle."
    for rule in plan.rules:
        if rule.cost_usd is not None:
            text += f" The rule '{rule.rule}' would lose {(rule.cost_usd - plan.cost_usd) / 1e3:,.0f} thousand USD."
    return text


def _text(plan: BuildPlan, warnings: tuple[str, ...], inputs: str) -> str:
    shown = ("date", "what", "serials", "from", "to", "before", "after", "cost_usd", "reason")
    proof = "proven best on its points" if plan.best.gap_frac <= 1e-6 else f"gap {100 * plan.best.gap_frac:.2f} %"
    lines = [DEMO] if DEMO in warnings else []
    lines += [sentence(plan), "", plan_table("actions", actions(plan), only=shown)]
    remainder = remainder_usd(plan)
    lines.append(
        f"Actions and {remainder / 1e3:,.1f} thousand USD of expected distress less life left at the end make "
        f"{plan.cost_usd / 1e3:,.1f} thousand USD ({proof}; no plan on these points is below "
        f"{min(plan.best.bound_usd, plan.cost_usd) / 1e3:,.1f})."
    )
    lines += ["", "Parts at the first opening", plan_table("build_parts", parts(plan))]
    lines += ["", "Against simple rules", plan_table("build_rules", rules(plan))]
    kept = [warning for warning in warnings if warning != DEMO]
    return "\n".join([*lines, "", footer(kept, inputs=inputs)])
