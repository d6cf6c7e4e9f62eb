"""The tables that answers about saved runs hold."""

from __future__ import annotations

from planner.schema.column import Table, flag, integer, number, text

_TABLES: tuple[Table, ...] = (
    Table(
        name="studies",
        row="one saved study",
        columns=(
            text("study", "Study", "its name: the fingerprint of what went in"),
            text("made_at", "Made at", "when it was saved (UTC)"),
            text("command", "Command", "the question"),
            text("strategies", "Strategies", "compared, in order"),
            integer("runs", "Runs", "finished of each strategy"),
            flag("finished", "Finished", "no: it was cancelled and holds the runs without gaps up to there"),
            integer("seed", "Seed", "of all luck"),
            text("version", "Version", "of the program that computed it"),
            text("inputs", "Inputs", "fingerprint of the records"),
        ),
    ),
    Table(
        name="study_settings",
        row="one setting in which two studies differ",
        columns=(
            text("what", "What", "setting or input"),
            text("first", "First", "in the first study"),
            text("second", "Second", "in the second study"),
        ),
    ),
    Table(
        name="study_totals",
        row="one strategy that two studies share, the first study less the second",
        columns=(
            text("strategy", "Strategy", "its name"),
            number("first_usd", "First mean", "mean total cost in the first study", low=None),
            number("second_usd", "Second mean", "mean total cost in the second study", low=None),
            number("total_usd_mean", "Difference mean", "first less second", low=None),
            number("total_usd_low", "Difference low", "lower end of the 95 % interval", low=None),
            number("total_usd_high", "Difference high", "upper end of the 95 % interval", low=None),
            flag("same_luck", "Same luck", "yes: compared run by run under the same seed"),
        ),
    ),
)
TABLES: dict[str, Table] = {table.name: table for table in _TABLES}
