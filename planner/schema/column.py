"""What a column and a table are, and how a unit is read from a column's name."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Kind = Literal["text", "serial", "integer", "number", "date", "choice", "flag", "list"]

_UNITS: dict[str, str] = {
    "_usd_per_kg": "USD/kg",
    "_usd_per_day": "USD/day",
    "_usd_per_month": "USD/month",
    "_usd_per_hour": "USD/h",
    "_usd_per_cycle": "USD/cycle",
    "_usd_per_year": "USD/year",
    "_usd_per_degC": "USD/degC",
    "_usd_per_engine_hour": "USD/engine h",
    "_usd": "USD",
    "_degC_per_1000_cycles": "degC per 1,000 cycles",
    "_degC_per_1000_hours": "degC per 1,000 h",
    "_frac_per_degC": "fraction per degC",
    "_frac_per_year": "fraction per year",
    "_per_year_frac": "fraction per year",
    "_hours_per_year": "h/year",
    "_cycles_per_year": "cycles/year",
    "_degC": "degC",
    "_kg_per_hour": "kg/h",
    "_kg_per_year": "kg/year",
    "_kg_per_s": "kg/s",
    "_kg": "kg",
    "_kN": "kN",
    "_kPa": "kPa",
    "_K": "K",
    "_frac": "fraction",
    "_cycles": "cycles",
    "_hours": "h",
    "_days": "days",
    "_minutes": "min",
    "_years": "years",
}


def unit_of(name: str) -> str:
    """Return the unit that a column's name carries, or an empty string.

    Units live in names: the longest known ending wins, so ``fuel_price_usd_per_kg`` is in USD/kg and not in kg.
    """
    for ending in sorted(_UNITS, key=len, reverse=True):
        if name.endswith(ending) or name == ending[1:]:
            return _UNITS[ending]
    if name.startswith(("cycles_", "limit_cycles")) or "_cycles_" in name:
        return "cycles"
    if name.startswith(("hours_", "limit_hours")):
        return "h"
    return ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column: its name, how it is read, its range and what it means.

    ``required``: the heading must be there and no cell may be blank. ``default`` is what a blank optional cell means
    (None: the value is unknown or does not apply). ``low`` and ``high`` are inclusive.
    """

    name: str
    kind: Kind
    label: str
    meaning: str
    required: bool = False
    default: str | float | int | None = None
    low: float | None = None
    high: float | None = None
    choices: tuple[str, ...] = ()
    example: str = ""

    @property
    def unit(self) -> str:
        return unit_of(self.name) if self.kind in ("integer", "number") else ""

    @property
    def heading(self) -> str:
        """Return label and unit as a heading shows them."""
        return f"{self.label} ({self.unit})" if self.unit else self.label


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """One table: its name, what a row is, its columns, the columns that identify a row, and who needs it.

    ``references`` lists (columns here, other table, columns there): every filled key must exist there.
    ``needed`` is true when the simulation cannot run without the table.
    """

    name: str
    row: str
    columns: tuple[Column, ...]
    key: tuple[str, ...] = ()
    references: tuple[tuple[tuple[str, ...], str, tuple[str, ...]], ...] = ()
    needed: bool = False

    def column(self, name: str) -> Column:
        """Return the column of that name; KeyError when the table has none."""
        for column in self.columns:
            if column.name == name:
                return column
        raise KeyError(name)

    @property
    def names(self) -> tuple[str, ...]:
        return tuple(column.name for column in self.columns)


def text(name: str, label: str, meaning: str, **more: object) -> Column:
    return Column(name=name, kind="text", label=label, meaning=meaning, **more)  # type: ignore[arg-type]


def serial(name: str, label: str, meaning: str, **more: object) -> Column:
    return Column(name=name, kind="serial", label=label, meaning=meaning, **more)  # type: ignore[arg-type]


def integer(name: str, label: str, meaning: str, **more: object) -> Column:
    more.setdefault("low", 0)
    return Column(name=name, kind="integer", label=label, meaning=meaning, **more)  # type: ignore[arg-type]


def number(name: str, label: str, meaning: str, **more: object) -> Column:
    more.setdefault("low", 0.0)
    return Column(name=name, kind="number", label=label, meaning=meaning, **more)  # type: ignore[arg-type]


def date(name: str, label: str, meaning: str, **more: object) -> Column:
    return Column(name=name, kind="date", label=label, meaning=meaning, **more)  # type: ignore[arg-type]


def choice(name: str, label: str, meaning: str, choices: tuple[str, ...], **more: object) -> Column:
    return Column(name=name, kind="choice", label=label, meaning=meaning, choices=choices, **more)  # type: ignore[arg-type]


def flag(name: str, label: str, meaning: str, **more: object) -> Column:
    more.setdefault("default", "no")
    return Column(
        name=name,
        kind="flag",
        label=label,
        meaning=meaning,
        choices=("yes", "no"),
        **more,  # type: ignore[arg-type]
    )


def listing(name: str, label: str, meaning: str, **more: object) -> Column:
    """A cell that holds several values, parted by spaces."""
    return Column(name=name, kind="list", label=label, meaning=meaning, **more)  # type: ignore[arg-type]
