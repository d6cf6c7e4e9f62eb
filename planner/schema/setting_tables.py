"""Settings, escalation indices and the season."""

from __future__ import annotations

from dataclasses import dataclass

from planner.schema.column import Table, integer, number, text


@dataclass(frozen=True, slots=True, kw_only=True)
class Setting:
    """One setting: how its value is read, what it means, and what holds when it is not given."""

    name: str
    kind: str
    meaning: str
    default: str | None = None
    low: float | None = None
    high: float | None = None


SETTINGS: tuple[Setting, ...] = (
    Setting(name="as_of", kind="date", meaning="the day on which the records are true; the study starts here"),
    Setting(name="fleet_name", kind="text", meaning="name shown on every page and report", default="Fleet"),
    Setting(name="demo", kind="flag", meaning="yes: the fleet is invented and every view says DEMO", default="no"),
    Setting(name="currency", kind="text", meaning="currency of every price", default="USD"),
    Setting(name="price_date", kind="date", meaning="the day for which prices hold (blank: as_of)", default=""),
    Setting(name="horizon_years", kind="number", meaning="years simulated", default="10", low=0.1, high=40),
    Setting(
        name="discount_rate_frac",
        kind="number",
        meaning="discount rate a year",
        default="0.085",
        low=0,
        high=0.5,
    ),
    Setting(name="fuel_price_usd_per_kg", kind="number", meaning="jet fuel price", default="0.85", low=0, high=20),
    Setting(
        name="spare_keeping_frac_per_year",
        kind="number",
        meaning="storage, insurance and preservation of a spare, as a share of its price a year",
        default="0.02",
        low=0,
        high=0.5,
    ),
    Setting(
        name="co2_kg_per_kg_fuel",
        kind="number",
        meaning="CO2 of burnt jet fuel (ICAO: 3.16)",
        default="3.16",
        low=0,
        high=5,
    ),
    Setting(name="co2_price_usd_per_kg", kind="number", meaning="price of emitted CO2", default="0", low=0, high=5),
    Setting(
        name="findings_sigma",
        kind="number",
        meaning="spread of the lognormal findings factor",
        default="0.18",
        low=0,
        high=2,
    ),
    Setting(
        name="warning_band_cycles",
        kind="integer",
        meaning="cycles left below which a part is shown as near its limit",
        default="500",
        low=0,
        high=20000,
    ),
    Setting(
        name="weak_margin_degC",
        kind="number",
        meaning="margin below which an engine counts as weak for pairing",
        default="12",
        low=0,
        high=100,
    ),
    Setting(
        name="weak_cycles",
        kind="integer",
        meaning="cycles left below which an engine counts as weak for pairing",
        default="600",
        low=0,
        high=20000,
    ),
    Setting(
        name="fresh_cycles",
        kind="integer",
        meaning="cycles since a build below which an engine counts as fresh for pairing",
        default="150",
        low=0,
        high=20000,
    ),
    Setting(
        name="weak_pair_usd",
        kind="number",
        meaning="cost set on a pair of two weak or two fresh engines",
        default="60000",
        low=0,
        high=1e8,
    ),
    Setting(
        name="cover_wanted_frac",
        kind="number",
        meaning="wanted chance that no aircraft is short of an engine",
        default="0.9",
        low=0,
        high=0.9999,
    ),
)

_TABLES: tuple[Table, ...] = (
    Table(
        name="settings",
        row="one setting",
        key=("name",),
        needed=True,
        columns=(
            text("name", "Setting", "name of the setting", required=True, example="as_of"),
            text("value", "Value", "its value", required=True, example="2026-07-01"),
        ),
    ),
    Table(
        name="indices",
        row="one escalation index",
        key=("index",),
        columns=(
            text(
                "index",
                "Index",
                "name of the index (parts, material, repair, labour, rent, test, transport, out_of_service, fuel)",
                required=True,
                example="parts",
            ),
            number(
                "per_year_frac",
                "Rise a year",
                "escalation a year",
                required=True,
                low=-0.2,
                high=1,
                example="0.06",
            ),
            integer(
                "step_month",
                "Step month",
                "month (1 to 12) whose first day brings the new list",
                default=1,
                low=1,
                high=12,
            ),
        ),
    ),
    Table(
        name="season",
        row="one month of the year",
        key=("month",),
        columns=(
            integer("month", "Month", "1 January to 12 December", required=True, low=1, high=12, example="7"),
            number(
                "share",
                "Share",
                "use in that month against an even year",
                required=True,
                high=5,
                example="1.16",
            ),
        ),
    ),
)
TABLES: dict[str, Table] = {table.name: table for table in _TABLES}
