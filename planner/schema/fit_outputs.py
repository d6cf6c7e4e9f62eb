"""The result tables of the question ``fit``: hazards, trends of removals, margins, steps, and the margin ahead."""

from __future__ import annotations

from planner.schema.column import Column, Table, choice, date, flag, integer, number, serial, text
from planner.schema.engine_tables import MODULE, RATING, TYPE


def _interval(name: str, label: str, meaning: str) -> tuple[Column, ...]:
    """Return a figure and the two ends of its 95 % interval (blank: the records set no end)."""
    return (
        number(name, label, meaning, low=None),
        number(f"{name}_low", f"{label}, low", "lower end of its 95 % interval", low=None),
        number(f"{name}_high", f"{label}, high", "upper end of its 95 % interval", low=None),
    )


_HAZARDS = Table(
    name="hazards_fitted",
    row="one fitted chance cause of a module",
    key=("engine_type", "module", "cause", "run"),
    columns=(
        TYPE,
        MODULE,
        text("cause", "Cause", "of removal"),
        choice("run", "Run", "first run or after a restoration", ("first", "mature")),
        choice("clock", "Clock", "what ages are counted in", ("cycles", "hours")),
        *_interval("shape", "Shape", "Weibull shape (1: constant hazard)"),
        *_interval("scale", "Scale", "Weibull characteristic life on the clock, in environment 1"),
        flag(
            "shape_held", "Shape held", "yes: too few failures, the shape is the table's and only the scale is fitted"
        ),
        integer("failures", "Failures", "of this cause in the records"),
        integer("between_looks", "Between looks", "failures known only to lie between two inspections"),
        integer("censored", "Censored", "stretches that ended otherwise or still run"),
        number("constant_chance", "Chance if constant", "of a shape so far from 1 were the hazard constant", high=1),
        number("fit_chance", "Chance if it fits", "of ages so far from the law were it true", high=1),
        *_interval("within_chance", "Early chance", "chance of an early failure after a build"),
        number(
            "best_age", "Best age", "at which a planned restoration costs least (blank: waiting does), on the clock"
        ),
        number("best_age_saves_frac", "Saves", "share of the cost of waiting for failures that it saves", high=1),
        text("note", "Note", "what to know before using it"),
    ),
)

_TRENDS = Table(
    name="removal_trends",
    row="whether a type's removals of a cause come more or less often, per hour flown",
    key=("engine_type", "cause"),
    columns=(
        TYPE,
        text("cause", "Cause", "of removal"),
        integer("failures", "Failures", "in the records"),
        date("from_date", "From", "where the records begin"),
        *_interval("shape", "Shape", "of the power-law process (above 1: more often)"),
        *_interval("hours_between", "Hours between", "engine hours of the fleet between removals, now"),
        number("no_trend_chance", "Chance if steady", "of a trend so strong were the rate constant", high=1),
        text("verdict", "Verdict", "in words"),
    ),
)

_MARGINS = Table(
    name="margins_fitted",
    row="the margin of one engine by its readings",
    key=("engine_serial",),
    columns=(
        serial("engine_serial", "Engine serial", "the engine"),
        TYPE,
        serial("tail", "Tail", "aircraft it flies on"),
        RATING,
        integer("readings", "Readings", "since the last visit"),
        integer("outliers", "Outliers", "readings that count for nearly nothing"),
        number("margin_degC", "Margin", "hot-day margin on the as-of date", low=None),
        number("margin_low_degC", "Margin, low", "lower end of its 95 % interval", low=None),
        number("margin_high_degC", "Margin, high", "upper end of its 95 % interval", low=None),
        number("rate_degC_per_1000_cycles", "Rate", "steady loss as this engine is flown", low=None),
        number("low", "Rate, low", "lower end of the rate's 95 % interval, degC per 1,000 cycles", low=None),
        number("high", "Rate, high", "upper end of the rate's 95 % interval, degC per 1,000 cycles", low=None),
        *_interval("early_loss_degC", "Early loss", "after a full restoration, as this engine is flown"),
        number("borrowed_frac", "Borrowed", "share of what is known of its rate that its type lends", high=1),
        integer("steps", "Steps", "lasting steps since the last visit"),
        number("removal_margin_degC", "Removal margin", "at which it comes off", low=None),
        date("date_p10", "P10", "removal margin met by then with a chance of 10 % (blank: not in sight)"),
        date("date_p50", "P50", "removal margin met by then with a chance of 50 %"),
        date("date_p90", "P90", "removal margin met by then with a chance of 90 %"),
        date("summer_until", "Summer until", "first day after the next summer at its base"),
        number("lasts_summer_chance", "Lasts the summer", "chance that the margin holds until then", high=1),
        text("note", "Note", "what to know before using it"),
    ),
)

_TYPES = Table(
    name="margin_types",
    row="what the engines of a type at a rating have in common, at environment 1 and the reference derate",
    key=("engine_type", "rating"),
    columns=(
        TYPE,
        RATING,
        integer("engines", "Engines", "with readings"),
        integer("readings", "Readings", "behind the figures"),
        *_interval("rate_degC_per_1000_cycles", "Rate", "steady loss"),
        number("rate_spread_degC", "Rate spread", "deviation between engines, degC per 1,000 cycles"),
        number("table_rate_degC_per_1000_cycles", "Rate by the table", "of wear, at the same use", low=None),
        *_interval("early_loss_degC", "Early loss", "after a full restoration"),
        number("table_early_loss_degC", "Early loss by the table", "of wear", low=None),
        *_interval("wash_gain_degC", "Wash gain", "just after a wash"),
        number("noise_degC", "Noise", "standard deviation of one reading"),
    ),
)

_STEPS = Table(
    name="margin_steps",
    row="one jump in an engine's margin: a visit, a wash, a swap, or a step that no record explains",
    columns=(
        serial("engine_serial", "Engine serial", "the engine"),
        date("from_date", "From", "last reading before it"),
        date("to_date", "To", "first reading after it"),
        number("size_degC", "Size", "margin gained", low=None),
        number("low", "Size, low", "lower end of its 95 % interval, degC", low=None),
        number("high", "Size, high", "upper end of its 95 % interval, degC", low=None),
        text("explained", "Explained", "by the records, or not"),
    ),
)

_AHEAD = Table(
    name="margin_ahead",
    row="an engine's margin at one reading or one day to come",
    key=("engine_serial", "date"),
    columns=(
        serial("engine_serial", "Engine serial", "the engine"),
        date("date", "Date", "of the reading, or the day to come"),
        integer("cycles_since_install", "Cycles since installation", "on that day"),
        number("reading_degC", "Reading", "as recorded (blank: to come)", low=None),
        number("margin_degC", "Fitted", "by the fit, or the lowest point of each wash's tooth to come", low=None),
        number("low", "Fitted, low", "lower end of the band of 95 %, degC", low=None),
        number("high", "Fitted, high", "upper end of the band of 95 %, degC", low=None),
        number("weight", "Weight", "what the reading counts for (0: outlier)", high=1),
        number("hottest_ambient_degC", "Hottest ambient", "at which full thrust keeps the redline", low=None),
        number("hot_day_degC", "Hot day", "hottest usual day of the month at its base", low=None),
    ),
)

TABLES: dict[str, Table] = {table.name: table for table in (_HAZARDS, _TRENDS, _MARGINS, _TYPES, _STEPS, _AHEAD)}
