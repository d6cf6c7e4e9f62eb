"""All tables that the program reads and writes, in the order in which documents list them."""

from __future__ import annotations

from planner.schema import (
    engine_outputs,
    engine_tables,
    fit_outputs,
    fleet_tables,
    output_tables,
    plan_outputs,
    plan_tables,
    record_outputs,
    saved_outputs,
    setting_tables,
    stock_outputs,
    work_tables,
)
from planner.schema.column import Table

TABLES: dict[str, Table] = {
    **setting_tables.TABLES,
    **engine_tables.TABLES,
    **work_tables.TABLES,
    **fleet_tables.TABLES,
    **plan_tables.TABLES,
}
OUTPUTS: dict[str, Table] = {
    **output_tables.TABLES,
    **engine_outputs.TABLES,
    **fit_outputs.TABLES,
    **plan_outputs.TABLES,
    **record_outputs.TABLES,
    **saved_outputs.TABLES,
    **stock_outputs.TABLES,
}
NEEDED: tuple[str, ...] = tuple(name for name, table in TABLES.items() if table.needed)
