"""The tables that answers hold, so that headings, units and documents come from one place."""

from __future__ import annotations

from planner.schema.column import Table, choice, date, flag, integer, number, serial, text
from planner.schema.engine_tables import TYPE

_TABLES: tuple[Table, ...] = (
    Table(
        name="problems",
        row="one problem in the records",
        columns=(
            text("file", "File", "file it stands in"),
            text("table", "Table", "table it stands in"),
            integer("row", "Row", "row as a spreadsheet shows it"),
            text("column", "Column", "column"),
            choice("severity", "Severity", "stops or warns", ("stops", "warns")),
            text("rule", "Rule", "rule that found it"),
            text("found", "Found", "what stands there"),
            text("expected", "Expected", "what should stand there"),
            text("message", "Message", "what is wrong and what to do"),
        ),
    ),
    Table(
        name="strategies_compared",
        row="one strategy",
        columns=(
            text("strategy", "Strategy", "its name"),
            integer("runs", "Runs", "runs behind the figures"),
            *(
                number(
                    f"total_usd_{name}",
                    f"Total cost {label}",
                    "present value on the consumption basis",
                    low=None,
                )
                for name, label in (("mean", "mean"), ("p10", "P10"), ("p50", "P50"), ("p90", "P90"))
            ),
            number("cash_usd_mean", "Cash mean", "present value of cash alone", low=None),
            number(
                "usd_per_engine_hour_mean",
                "Cost an engine hour",
                "USD for each engine flight hour flown",
                low=None,
            ),
            number(
                "usd_per_planned_hour_mean",
                "Cost a planned hour",
                "USD for each engine flight hour planned",
                low=None,
            ),
            number("usd_per_cycle_mean", "Cost a cycle", "USD for each engine cycle flown", low=None),
            number("aircraft_days_lost_mean", "Aircraft-days lost", "over the horizon"),
            number("removals_mean", "Removals", "over the horizon"),
            number("time_on_wing_hours_mean", "Time on wing", "engine hours between installation and removal"),
            number("shortages_mean", "Shortages", "times an aircraft waited for an engine"),
            number("stub_cycles_mean", "Stub", "cycles thrown away with each part replaced early"),
            number("fuel_kg_mean", "Wear fuel", "fuel burnt because of wear"),
            number("co2_kg_mean", "CO2 of wear", "from that fuel"),
        ),
    ),
    Table(
        name="differences",
        row="one pair of strategies, a less b",
        columns=(
            text("a", "Strategy a", "first"),
            text("b", "Strategy b", "second"),
            number("total_usd_mean", "Difference mean", "total cost of a less that of b", low=None),
            number("total_usd_low", "Difference low", "lower end of the 95 % interval", low=None),
            number("total_usd_high", "Difference high", "upper end of the 95 % interval", low=None),
            number("cheaper_chance", "Chance that a is cheaper", "share of runs in which a costs less", high=1),
        ),
    ),
    Table(
        name="costs",
        row="one line of cost of a strategy in a year",
        columns=(
            text("strategy", "Strategy", "its name"),
            TYPE,
            integer("year", "Year", "calendar year"),
            text("line", "Line", "line of cost"),
            number("usd_mean", "Cost mean", "present value", low=None),
        ),
    ),
    Table(
        name="sweep",
        row="one horizon on one basis",
        columns=(
            integer("horizon_years", "Horizon", "years"),
            choice("basis", "Basis", "of the money", ("consumption", "cash")),
            text("cheapest", "Cheapest", "strategy with the least mean cost"),
        ),
    ),
    Table(
        name="life_parts",
        row="one part and what it has left",
        columns=(
            serial("part_serial", "Part serial", "the part"),
            text("part_number", "Part number", "its number"),
            serial("module_serial", "Module serial", "module it is in"),
            serial("engine_serial", "Engine serial", "engine it is in"),
            serial("tail", "Tail", "aircraft it flies on"),
            text("rating", "Rating", "rating it flies at"),
            integer("limit_cycles", "Limit", "in force"),
            text("limit_source", "Limit source", "revision or directive"),
            integer("cycles_used", "Cycles used", "since new"),
            text("cycles_by_rating", "Flown", "cycles at each rating flown"),
            text("counting_rule", "Counting rule", "how cycles at several ratings add up"),
            number("used_frac", "Used", "fraction of life used"),
            integer("cycles_left", "Cycles left", "at that rating, rounded down"),
            number("hours_left", "Hours left", "where the limit counts hours"),
            number("days_left", "Days left", "where the limit counts days"),
            text("state", "State", "at limit, near limit, unknown or clear"),
            flag("life_known", "Life known", "no: counted as zero"),
            date("date_reached", "Date reached", "at planned use with the season"),
            number("value_left_usd", "Value left", "at the part's price"),
            text("owner", "Owner", "who owns it"),
        ),
    ),
)
TABLES: dict[str, Table] = {table.name: table for table in _TABLES}
