"""The progress protocol."""

from __future__ import annotations

import pytest

from planner.base.errors import CancelledError
from planner.base.progress import NoProgress, Progress, stop_if_cancelled


class Asked(NoProgress):
    """Somebody has asked to stop."""

    def cancelled(self) -> bool:
        return True


def test_work_nobody_watches_goes_on() -> None:
    progress: Progress = NoProgress()
    progress.report("Step", 0.5)
    progress.improved({"value": 1.0})
    stop_if_cancelled(progress)


def test_work_that_is_asked_to_stop_stops() -> None:
    with pytest.raises(CancelledError):
        stop_if_cancelled(Asked())
