"""The errors of running and saving studies that a user can put right; the tree's root is in ``sim.errors``.

UserError
+-- LostWorkersError     the places where jobs ran went away, or a job kills whatever runs it
+-- SavedRunsError       saved runs are missing, damaged, or cannot be written
"""

from __future__ import annotations

from sim.errors import UserError


class LostWorkersError(UserError):
    """The work cannot go on where it was; what was finished is kept."""

    def __init__(self, what: str, done: int, total: int, remedy: str) -> None:
        super().__init__(what, done, total, remedy)
        self.what, self.done, self.total, self.remedy = what, done, total, remedy

    def __str__(self) -> str:
        return f"{self.what}; {self.done} of {self.total} runs were finished; {self.remedy}"


class SavedRunsError(UserError):
    """A saved study is not there, is damaged, or cannot be written."""

    def __init__(self, what: str, why: str, remedy: str) -> None:
        super().__init__(what, why, remedy)
        self.what, self.why, self.remedy = what, why, remedy

    def __str__(self) -> str:
        return f"{self.what}: {self.why}; {self.remedy}"
