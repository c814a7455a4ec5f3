"""Errors: words, exit codes, pickling."""

from __future__ import annotations

import pickle

import pytest

from planner.base import errors


@pytest.mark.parametrize(
    ("kind", "code"),
    [
        (errors.RangewrightError, 1),
        (errors.CallError, 2),
        (errors.DataError, 3),
        (errors.PlanFileError, 3),
        (errors.FitError, 3),
        (errors.LimitsError, 4),
        (errors.CancelledError, 130),
    ],
)
def test_pickled_intact(kind: type[errors.RangewrightError], code: int) -> None:
    error = kind("problem.", place="place", remedy="remedy", report="report")
    copy = pickle.loads(pickle.dumps(error))
    assert type(copy) is kind
    assert vars(copy) == vars(error)
    assert copy.exit_code == code


def test_words() -> None:
    assert str(errors.CallError("problem.")) == "problem."
    assert str(errors.CallError("problem.", place="a.csv", remedy="Do this.")) == "a.csv: problem. Do this."
