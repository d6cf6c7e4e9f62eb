"""The tables of the removals ahead and of spare holdings."""

from __future__ import annotations

from planner.schema.column import Table, choice, date, flag, integer, number, serial, text
from planner.schema.engine_tables import TYPE

_USD = {"low": None}
_DATES = (
    date("date_p10", "P10", "by then with a chance of 10 % (blank: not within 40 years)"),
    date("date_p50", "P50", "by then with a chance of 50 %"),
    date("date_p90", "P90", "by then with a chance of 90 %"),
)
_ITEM = text("item", "Item", "engine, or a module's name", example="LPT")

_TABLES: tuple[Table, ...] = (
    Table(
        name="removals_ahead",
        row="one cause that will take an engine off, among its first three",
        key=("engine_serial", "rank"),
        columns=(
            serial("engine_serial", "Engine serial", "the engine"),
            TYPE,
            serial("tail", "Tail", "aircraft it flies on"),
            text("base", "Base", "of the aircraft"),
            integer("rank", "Rank", "1: expected first"),
            text("cause", "Cause", "limit, margin, distress, unscheduled and so on"),
            text("module", "Module", "module that asks for it (blank: the engine)"),
            serial("part_serial", "Part serial", "the part whose limit it is"),
            *_DATES,
            number("first_chance", "Comes first", "chance that this cause takes the engine off", high=1),
        ),
    ),
    Table(
        name="engines_ahead",
        row="one engine and its first removal, whatever the cause",
        key=("engine_serial",),
        columns=(
            serial("engine_serial", "Engine serial", "the engine"),
            TYPE,
            serial("tail", "Tail", "aircraft it flies on"),
            text("base", "Base", "of the aircraft"),
            *_DATES,
            text("binding", "What binds", "in words"),
            number("summer_chance", "Lasts the summer", "chance to be on still after 30 September", high=1),
            number("margin_degC", "Margin", "hot-day margin today", low=None),
            number("hottest_degC", "Keeps the redline to", "hottest ambient at full thrust today", low=None),
            flag("hot_day", "Hot day fits", "no: the base's hottest day lies above that"),
        ),
    ),
    Table(
        name="months_ahead",
        row="one month of one type",
        key=("engine_type", "month"),
        columns=(
            TYPE,
            date("month", "Month", "its first day"),
            number("removals", "Removals", "expected, that ask for a spare"),
            integer("removals_p10", "Removals P10", "no fewer with a chance of 90 %"),
            integer("removals_p90", "Removals P90", "no more with a chance of 90 %"),
            number("away", "Engines away", "expected, on the month's average"),
            integer("spares", "Spares", "owned, less those that fill positions for good", low=None),
            number("short", "Engines short", "away beyond the spares, expected"),
            number("short_chance", "Chance of being short", "more engines away than spares", high=1),
            number("slots_needed", "Slots needed", "engines that go to a shop"),
            number("slots", "Slots", "that exist (blank: no bound)"),
            number("removals_simulated", "Removals simulated", "mean over the runs"),
            number("short_chance_simulated", "Short, simulated", "share of days on which an aircraft waits", high=1),
        ),
    ),
    Table(
        name="month_causes",
        row="one cause in one month",
        key=("engine_type", "month", "cause"),
        columns=(
            TYPE,
            date("month", "Month", "its first day"),
            text("cause", "Cause", "planned or chance, and the module"),
            number("removals", "Removals", "expected"),
        ),
    ),
    Table(
        name="spans_ahead",
        row="one cause within 12, 36 or 60 months",
        key=("engine_type", "months", "cause"),
        columns=(
            TYPE,
            integer("months", "Months", "from the as-of date"),
            text("cause", "Cause", "planned or chance, and the module; all: every cause"),
            number("removals", "Removals", "expected"),
            integer("removals_p10", "Removals P10", "no fewer with a chance of 90 %"),
            integer("removals_p90", "Removals P90", "no more with a chance of 90 %"),
        ),
    ),
    Table(
        name="use_effects",
        row="one change of use and what it does to the removals",
        key=("engine_type", "change"),
        columns=(
            TYPE,
            text("change", "Change", "utilisation, derate or base"),
            number("removals_12", "In 12 months", "removals expected"),
            number("removals_36", "In 36 months", "removals expected"),
            number("removals_60", "In 60 months", "removals expected"),
            number("difference_60", "Change in 60 months", "against the plan", low=None),
        ),
    ),
    Table(
        name="holdings_curve",
        row="one holding: how many of each item, what it costs, what it covers",
        columns=(
            TYPE,
            text("stocks", "Stock", "item at base: number"),
            number("spares_price_usd", "Price of spares", "what they cost new, the budget axis"),
            number("total_usd", "Cost", "present value over the horizon", **_USD),
            number("against_today_usd", "Against today", "cost less that of today's holding", **_USD),
            number("cover_frac", "Cover", "share of time in which no aircraft is short", high=1),
            number("engines_short_mean", "Engines short", "on average"),
            choice("by", "By", "how it was found", ("formula", "simulation")),
            flag("on_curve", "On the curve", "yes: nothing cheaper covers as much"),
            integer("engines", "Engines", "spare engines"),
            integer("runs", "Runs", "behind a simulated figure"),
            flag("today", "Today", "yes: what is held now"),
        ),
    ),
    Table(
        name="holdings_best",
        row="the best holding of a type",
        key=("engine_type",),
        columns=(
            TYPE,
            text("stocks", "Stock", "item at base: number"),
            number("spares_price_usd", "Price of spares", "what they cost new"),
            number("total_usd", "Cost", "present value over the horizon", **_USD),
            number("cover_frac", "Cover", "share of time in which no aircraft is short", high=1),
            number("engines_short_mean", "Engines short", "on average"),
            choice("by", "By", "how it was found", ("formula", "simulation")),
            text("sure", "How sure", "what is promised, and on which runs"),
        ),
    ),
    Table(
        name="holdings_steps",
        row="one more, or one fewer, of an item",
        key=("engine_type", "item", "change"),
        columns=(
            TYPE,
            _ITEM,
            integer("change", "Change", "+1 or -1", low=None),
            integer("held", "Held", "today"),
            number("price_usd", "Price", "of one, new"),
            number("cover_frac", "Cover", "with the change", high=1),
            number("cover_gain_frac", "Cover gained", "against today", low=None),
            number("short_saved", "Short saved", "engines short on average, against today", low=None),
            number("worth_usd", "Worth", "present value saved, its own cost taken off", **_USD),
        ),
    ),
    Table(
        name="holdings_breaks",
        row="one thing that goes wrong and what it does to today's holding",
        key=("engine_type", "change"),
        columns=(
            TYPE,
            text("change", "Change", "what goes wrong, or right"),
            number("cover_frac", "Cover", "of today's holding then", high=1),
            number("cover_change_frac", "Cover changed", "against the plan", low=None),
            number("engines_short_mean", "Engines short", "on average"),
            number("cost_change_usd", "Cost changed", "present value over the horizon", **_USD),
            integer("engines_for_target", "Engines for the target", "spare engines that the target asks for then"),
        ),
    ),
    Table(
        name="holdings_ways",
        row="one way to have a spare engine at hand",
        key=("engine_type", "way"),
        columns=(
            TYPE,
            choice("way", "Way", "how", ("buy", "lease", "share a pool", "go short")),
            number("usd_per_year", "A year", "cost a year at today's prices", **_USD),
            number("usd_per_day_used", "A day used", "cost for each day on which it is needed", **_USD),
            number("short_saved", "Short saved", "engines short on average", low=None),
            text("words", "In words", "what it takes, and its risk"),
        ),
    ),
    Table(
        name="holdings_places",
        row="one number of spare engines and where to hold them",
        key=("engine_type", "engines", "base"),
        columns=(
            TYPE,
            integer("engines", "Engines", "spare engines in all"),
            text("base", "Base", "where"),
            integer("count", "Count", "held there"),
            number("engines_short_mean", "Engines short", "over all bases, on average"),
        ),
    ),
)
TABLES: dict[str, Table] = {table.name: table for table in _TABLES}
