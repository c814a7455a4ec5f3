"""Named errors: every one carries the value, the limit or expectation, the place and the remedy.

The command line and the window each have one function that shows them; no other
code formats errors for the user.
"""

from __future__ import annotations


class RangewrightError(Exception):
    """Base of every error a user may see.

    problem: what is wrong, with the offending value and the limit or expectation.
    place:   where (file, row, column, item, cluster ...); may be empty.
    remedy:  what the user can do about it; may be empty.
    report:  for an unexpected error of the program: its lines, to be sent to whoever looks after it.
    """

    exit_code = 1

    def __init__(self, problem: str, *, place: str = "", remedy: str = "", report: str = "") -> None:
        super().__init__(problem, place, remedy)
        self.problem = problem
        self.place = place
        self.remedy = remedy
        self.report = report

    def __str__(self) -> str:
        head = f"{self.place}: {self.problem}" if self.place else self.problem
        return f"{head} {self.remedy}" if self.remedy else head

    def __reduce__(self) -> tuple[object, ...]:
        # Keyword-only fields need help to survive the pipe of a child process.
        return _rebuild, (type(self), self.problem, self.place, self.remedy, self.report)


def _rebuild(
    kind: type[RangewrightError], problem: str, place: str, remedy: str, report: str
) -> RangewrightError:
    return kind(problem, place=place, remedy=remedy, report=report)


class CallError(RangewrightError):
    """Wrong call, unknown code, or a plan file open elsewhere (exit 2)."""

    exit_code = 2


class DataError(RangewrightError):
    """Input that cannot be used: a file, a column's meaning, a table (exit 3)."""

    exit_code = 3


class PlanFileError(DataError):
    """A plan file that is damaged, foreign, too new, or unreadable (exit 3)."""


class FitError(DataError):
    """A share model that cannot be fitted on this history (exit 3)."""


class LimitsError(RangewrightError):
    """No assortment meets the limits; the problem names those that clash (exit 4)."""

    exit_code = 4


class CancelledError(RangewrightError):
    """The user cancelled a job (exit 130)."""

    exit_code = 130
