"""The errors that a user can put right, as one small tree.

    UserError                what every face catches and shows without a traceback
    +-- RecordsError         the user's tables are at fault; carries every problem found
    +-- RequestError         the question is at fault (a strategy, date or number that cannot be)
    +-- OutOfRangeError      an input of the physics lies outside what the model may answer
    +-- NoSolutionError      the equations have no acceptable root
    +-- UnpricedError        an event happened that no price covers

Anything else is a bug and may show its traceback. Each class hands its own arguments to ``super().__init__`` so that it
survives pickling through event kernels and process pools.
"""

from __future__ import annotations

from typing import NamedTuple


class Problem(NamedTuple):
    """One fault in the records, told so that it can be mended.

    ``row`` is the number that a spreadsheet shows (headings are row 1), or None where the fault is not in one row.
    ``severity`` is ``stops`` or ``warns``.
    """

    file: str
    table: str
    row: int | None
    column: str
    severity: str
    rule: str
    found: str
    expected: str
    message: str

    def sentence(self) -> str:
        """Return the problem as one sentence: where, what was found, what was expected, what to do."""
        where = self.file or self.table
        if self.row is not None:
            where += f" row {self.row}"
        if self.column:
            where += f", column {self.column}"
        return f"{where}: {self.message}"


class UserError(Exception):
    """Base of every error that the user can put right."""


class RecordsError(UserError):
    """The tables hold problems that stop the work; all of them are carried."""

    def __init__(self, problems: tuple[Problem, ...]) -> None:
        super().__init__(problems)
        self.problems = problems

    def __str__(self) -> str:
        lines = [problem.sentence() for problem in self.problems]
        head = f"{len(lines)} problem{'s' if len(lines) != 1 else ''} in the records:"
        return "\n".join([head, *(f"  {line}" for line in lines)])


class RequestError(UserError):
    """The question cannot be answered as asked."""

    def __init__(self, what: str, found: str, expected: str, remedy: str = "") -> None:
        super().__init__(what, found, expected, remedy)
        self.what, self.found, self.expected, self.remedy = what, found, expected, remedy

    def __str__(self) -> str:
        text = f"{self.what}: found {self.found}, expected {self.expected}"
        return f"{text}; {self.remedy}" if self.remedy else text


class OutOfRangeError(RequestError):
    """An input lies outside the range in which the physics may answer."""


class NoSolutionError(UserError):
    """The equations have no acceptable root at these inputs."""

    def __init__(self, what: str, why: str) -> None:
        super().__init__(what, why)
        self.what, self.why = what, why

    def __str__(self) -> str:
        return f"{self.what}: no solution, {self.why}"


class UnpricedError(UserError):
    """Something happened that no price covers; an unpriced event is an error, never a zero."""

    def __init__(self, items: tuple[str, ...]) -> None:
        super().__init__(items)
        self.items = items

    def __str__(self) -> str:
        listed = "; ".join(self.items)
        return f"no price for: {listed}; add the rows to the price tables or remove the work"
