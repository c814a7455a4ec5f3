"""Jobs that the runner's tests start in a child process, and a parent that is killed."""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Iterator
from pathlib import Path

from planner.base.errors import CancelledError, DataError
from planner.base.progress import Progress, stop_if_cancelled
from planner.base.runner import ChildRunner

FOREVER = 60.0


def warm() -> None:
    """Leave a mark that ``was_warm`` finds."""
    os.environ["RUNNER_WAS_WARM"] = "yes"


def warm_by_pieces() -> Iterator[None]:
    """Mark each of two pieces."""
    os.environ["RUNNER_WAS_WARM"] = "first"
    yield
    os.environ["RUNNER_WAS_WARM"] = "second"


def broken_warm() -> None:
    """A warm-up that fails."""
    raise ImportError("not there")


def add(left: int, right: int, progress: Progress) -> int:
    """Report once and add."""
    progress.report("Adding", 0.5)
    return left + right


def surroundings(progress: Progress) -> tuple[str, str, int]:
    """(mark of the warm-up, BLAS threads, process number)."""
    return os.environ.get("RUNNER_WAS_WARM", "no"), os.environ["OPENBLAS_NUM_THREADS"], os.getpid()


def chatter(times: int, progress: Progress) -> int:
    """Report as fast as possible; the last report and answer must arrive."""
    for number in range(times):
        progress.report(f"Step {number}", number / times)
        progress.improved({"value": float(number)})
    return times


def wrong_data(progress: Progress) -> None:
    """Fail with a named error."""
    raise DataError("17 columns", place="sales.csv, row 3", remedy="Use 5.")


def wrong_program(progress: Progress) -> None:
    """Fail with an unexpected error."""
    raise ZeroDivisionError("by nought")


def not_for_pipes(progress: Progress) -> object:
    """A result that cannot be pickled."""
    return lambda: None


def dies(progress: Progress) -> None:
    """End without a word."""
    os._exit(3)


def polite(progress: Progress) -> None:
    """Improve, then wait until asked to stop."""
    progress.improved({"value": 1.5})
    until = time.monotonic() + FOREVER
    while time.monotonic() < until:
        stop_if_cancelled(progress)
        time.sleep(0.005)


def keeps_its_best(progress: Progress) -> str:
    """Wait until asked to stop, then return what was found."""
    progress.report("Searching")
    until = time.monotonic() + FOREVER
    while not progress.cancelled() and time.monotonic() < until:
        time.sleep(0.005)
    return "best so far"


def deaf(progress: Progress) -> None:
    """Improve, then never look up again."""
    progress.improved({"value": 2.5})
    time.sleep(FOREVER)


def cancels_itself(progress: Progress) -> None:
    """Raise as if asked to stop."""
    raise CancelledError("Cancelled.")


def big(megabytes: int, progress: Progress) -> bytes:
    """A result that fills the pipe many times."""
    return bytes(megabytes * 2**20)


def size_of(data: bytes, progress: Progress) -> int:
    """Length of a large argument."""
    return len(data)


def parent_of_a_deaf_child(note: Path) -> None:
    """Start a child that never looks up, write its number, wait to be killed."""
    runner = ChildRunner()
    runner.start("tests.base.targets:deaf", ())
    while not any(message.kind == "improved" for message in runner.poll()):
        time.sleep(0.01)
    part = note.with_suffix(".part")
    part.write_text(str(runner.process_id), encoding="ascii")
    part.replace(note)
    time.sleep(FOREVER)


if __name__ == "__main__":
    parent_of_a_deaf_child(Path(sys.argv[1]))
