"""The tables that answers about the records themselves hold: what moved, what limits, who is hit, whose it is."""

from __future__ import annotations

from planner.schema.column import Table, choice, date, flag, integer, number, serial, text

CHANGE_KINDS = ("swap", "visit", "use", "correction", "limit", "price", "new", "gone", "other")

_TABLES: tuple[Table, ...] = (
    Table(
        name="changes",
        row="one thing that differs between two versions of the records",
        columns=(
            text("table", "Table", "where it stands"),
            text("key", "Key", "serial or other key of the row"),
            choice("what", "What", "kind of change", CHANGE_KINDS),
            text("column", "Column", "column that differs (blank: the whole row)"),
            text("before", "Before", "value in the other version"),
            text("after", "After", "value in this version"),
            text("note", "Note", "what it means in words"),
        ),
    ),
    Table(
        name="life_engines",
        row="one engine and the parts that limit it",
        columns=(
            serial("engine_serial", "Engine serial", "the engine"),
            serial("tail", "Tail", "aircraft it hangs on"),
            text("rating", "Rating", "rating it is counted at"),
            integer("cycles_left", "Cycles left", "the least over its parts"),
            text("state", "State", "at limit, near limit, unknown or clear"),
            serial("limiting_part_serial", "Limiting part", "part that has least left"),
            date("date_reached", "Date reached", "at planned use with the season"),
            serial("second_part_serial", "Second part", "next part"),
            integer("second_cycles_left", "Second left", "cycles left on it"),
            serial("third_part_serial", "Third part", "the one after"),
            integer("third_cycles_left", "Third left", "cycles left on it"),
        ),
    ),
    Table(
        name="life_directives",
        row="one part hit by a directive",
        columns=(
            text("directive", "Directive", "its name"),
            date("valid_from", "Valid from", "day from which it holds"),
            serial("part_serial", "Part serial", "part hit"),
            serial("engine_serial", "Engine serial", "engine it is in"),
            serial("tail", "Tail", "aircraft it flies on"),
            text("rating", "Rating", "rating counted at"),
            integer("limit_before_cycles", "Limit before", "limit without the directive"),
            integer("limit_after_cycles", "Limit after", "limit with it"),
            integer("cycles_left_before", "Left before", "today, without the directive"),
            integer("cycles_left_after", "Left after", "today, with it"),
            flag("over_on_day_one", "Over on its first day", "yes: past the new limit when it comes into force"),
            date("date_reached", "Date reached", "day on which the part must be off"),
            number("value_lost_usd", "Value lost", "of the life taken away, at the part's price"),
        ),
    ),
    Table(
        name="life_places",
        row="one module or part that is in another owner's assembly",
        columns=(
            serial("serial", "Serial", "module or part"),
            text("owner", "Owner", "whose it is"),
            text("place", "Place", "where it is"),
            serial("flies_on", "Flies on", "engine or module that it is in"),
            text("flies_on_owner", "Owner there", "whose that is"),
            date("due_back", "Due back", "next return of a lease of either owner"),
        ),
    ),
)
TABLES: dict[str, Table] = {table.name: table for table in _TABLES}
