"""The result tables of the question ``engine``: stations, coefficients, ratings, ambient, restorations, exchanges."""

from __future__ import annotations

from planner.schema.column import Column, Table, choice, integer, number, serial, text
from planner.schema.engine_tables import MODULE, RATING, TYPE


def _banded(name: str, label: str, meaning: str) -> tuple[Column, ...]:
    """Return a figure and the two ends of its band."""
    return (
        number(name, label, meaning, low=None),
        number(f"{name}_low", f"{label}, low", "lower end of its band", low=None),
        number(f"{name}_high", f"{label}, high", "upper end of its band", low=None),
    )


_TABLES: tuple[Table, ...] = (
    Table(
        name="stations",
        row="one station of the gas path at a condition",
        columns=(
            TYPE,
            text("condition", "Condition", "take-off on the standard day or at the corner point, or cruise"),
            text("station", "Station", "its number by SAE ARP 755"),
            text("place", "Place", "where that is"),
            number("flow_kg_per_s", "Flow", "gas flow"),
            number("temperature_K", "Temperature", "total"),
            number("pressure_kPa", "Pressure", "total, kPa"),
            number("fuel_air_ratio", "Fuel-air ratio", "fuel burnt over air"),
        ),
    ),
    Table(
        name="coefficients",
        row="one point lost in a component, at constant thrust; positive is hotter or more fuel",
        columns=(
            TYPE,
            MODULE,
            text("component", "Component", "part of the gas path in that module"),
            choice(
                "change",
                "Change",
                "one point of efficiency, 1 % of flow capacity lost, one point more pressure loss, or 1 % more throat",
                ("efficiency", "flow_capacity", "pressure_loss", "throat_area"),
            ),
            *_banded("egt_K", "EGT", "at the probe's station, corner-point day, highest rating"),
            *_banded("egt_frac", "EGT share", "of the absolute EGT"),
            *_banded("fuel_takeoff_frac", "Take-off fuel", "share of fuel flow"),
            *_banded("fuel_cruise_frac", "Cruise fuel", "share of fuel flow"),
        ),
    ),
    Table(
        name="ratings_heat",
        row="one rating and what ambient and thrust do to its EGT",
        columns=(
            TYPE,
            RATING,
            number("thrust_kN", "Thrust", "rated take-off thrust"),
            number("new_margin_degC", "Margin when new", "of the table ratings", low=None),
            number("model_margin_degC", "Margin by the cycle", "from the highest rating's margin", low=None),
            number("egt_per_ambient", "EGT per ambient", "of the table engine_types, degC a degC"),
            *_banded("model_egt_per_ambient", "EGT per ambient by the cycle", "degC a degC at constant thrust"),
            number("degC_per_thrust_point", "EGT a point of thrust", "a point of derate cools by that", low=None),
            number("hottest_ambient_degC", "Hottest ambient", "a new engine keeps the redline", low=None),
            number("model_hottest_ambient_degC", "Hottest ambient by the cycle", "the same", low=None),
        ),
    ),
    Table(
        name="ambient",
        row="the margin of a new engine at full rated thrust at one ambient temperature",
        columns=(
            TYPE,
            RATING,
            number("ambient_degC", "Ambient", "air temperature at sea level", low=None),
            number("margin_degC", "Margin", "redline less EGT", low=None),
        ),
    ),
    Table(
        name="restorations",
        row="what restoring one module brings, the mean over those that fly",
        columns=(
            TYPE,
            MODULE,
            text("level", "Level", "of the work"),
            integer("flying", "Flying", "modules that the mean is of"),
            number("lost_degC", "Lost", "margin lost today", low=None),
            number("regained_degC", "Regained", "margin that the work gives back", low=None),
            number("cost_usd", "Cost", "of the work with opening the module"),
            number("usd_per_degC", "Cost a degree", "cost over margin regained, USD/degC"),
            number("fuel_kg_per_year", "Fuel saved", "kg a year of one engine", low=None),
            number("fuel_usd_per_year", "Fuel saved, money", "USD a year of one engine at today's price", low=None),
        ),
    ),
    Table(
        name="spare_on_engine",
        row="one spare module on one engine",
        columns=(
            serial("engine_serial", "Engine serial", "the engine"),
            serial("tail", "Tail", "aircraft it flies on"),
            RATING,
            MODULE,
            serial("module_off", "Module off", "comes off"),
            serial("module_on", "Module on", "goes on"),
            number("margin_before_degC", "Margin before", "new margin less what its modules lost", low=None),
            number("margin_after_degC", "Margin after", "the same with the spare", low=None),
            number("gained_degC", "Gained", "margin gained", low=None),
            number("fuel_kg_per_year", "Fuel saved", "kg a year", low=None),
            number("fuel_usd_per_year", "Fuel saved, money", "USD a year at today's price", low=None),
        ),
    ),
)
TABLES: dict[str, Table] = {table.name: table for table in _TABLES}
