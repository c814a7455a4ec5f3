"""The child process: what it says, how it is stopped, that nothing is left of it."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from planner.base.errors import DataError
from planner.base.runner import ChildRunner, Message

ROOT = Path(__file__).resolve().parents[2]
PATIENCE = 30.0


def target(name: str) -> str:
    return f"tests.base.targets:{name}"


@pytest.fixture(scope="module")
def shared() -> Iterator[ChildRunner]:
    """One living child for the tests that do not hurt it."""
    runner = ChildRunner(target("warm"))
    yield runner
    runner.close()


@pytest.fixture
def own() -> Iterator[ChildRunner]:
    runner = ChildRunner()
    yield runner
    runner.close()


def until_last(runner: ChildRunner) -> list[Message]:
    """Poll as the window does until the job has ended."""
    messages: list[Message] = []
    until = time.monotonic() + PATIENCE
    while runner.busy and time.monotonic() < until:
        messages += runner.poll()
        time.sleep(0.005)
    assert not runner.busy
    return messages


def run(runner: ChildRunner, name: str, *arguments: object) -> list[Message]:
    runner.start(target(name), arguments)
    return until_last(runner)


def wait_for(runner: ChildRunner, kind: str) -> list[Message]:
    messages: list[Message] = []
    until = time.monotonic() + PATIENCE
    while not any(message.kind == kind for message in messages) and time.monotonic() < until:
        messages += runner.poll()
        time.sleep(0.005)
    return messages


def alive(process: int) -> bool:
    """Running, not a zombie."""
    try:
        state = Path(f"/proc/{process}/stat").read_text(encoding="ascii").rpartition(")")[2].split()[0]
    except FileNotFoundError:
        return False
    return state != "Z"


def test_progress_and_result(shared: ChildRunner) -> None:
    messages = run(shared, "add", 2, 3)
    assert [message.kind for message in messages] == ["progress", "done"]
    assert (messages[0].step, messages[0].fraction) == ("Adding", 0.5)
    assert messages[1].result == 5


def test_the_child_is_warm_has_one_blas_thread_and_stays(shared: ChildRunner) -> None:
    before = {name: os.environ.get(name) for name in ("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")}
    first = run(shared, "surroundings")[-1].result
    second = run(shared, "surroundings")[-1].result
    assert first == ("yes", "1", shared.process_id)
    assert second == first
    assert {name: os.environ.get(name) for name in before} == before


def test_reports_are_throttled_and_the_last_ones_arrive(shared: ChildRunner) -> None:
    began = time.monotonic()
    messages = run(shared, "chatter", 20_000)
    seconds = time.monotonic() - began
    for kind in ("progress", "improved"):
        count = sum(message.kind == kind for message in messages)
        assert 1 <= count <= 20.0 * seconds + 3
    steps = [message for message in messages if message.kind == "progress"]
    answers = [message for message in messages if message.kind == "improved"]
    assert steps[-1].step == "Step 19999"
    assert answers[-1].answer == {"value": 19999.0}
    assert messages[-1].result == 20_000


def test_named_errors_cross_intact(shared: ChildRunner) -> None:
    error = run(shared, "wrong_data")[-1].error
    assert type(error) is DataError
    assert (error.problem, error.place, error.remedy) == ("17 columns", "sales.csv, row 3", "Use 5.")
    assert error.report == ""


@pytest.mark.parametrize(
    ("name", "words"),
    [("wrong_program", "by nought"), ("not_for_pipes", "lambda"), ("missing_function", "missing_function")],
)
def test_unexpected_errors_bring_a_report(shared: ChildRunner, name: str, words: str) -> None:
    last = run(shared, name)[-1]
    assert last.kind == "failed"
    assert last.error is not None
    assert words in last.error.problem
    assert "Traceback" in last.error.report
    assert run(shared, "add", 1, 1)[-1].result == 2


def test_arguments_that_cannot_be_pickled_fail_the_job_only(shared: ChildRunner) -> None:
    last = run(shared, "add", lambda: None, 1)[-1]
    assert last.kind == "failed"
    assert run(shared, "add", 1, 1)[-1].result == 2


def test_large_arguments_and_results_do_not_block_the_caller(own: ChildRunner) -> None:
    began = time.monotonic()
    own.start(target("size_of"), (bytes(64 * 2**20),))
    assert time.monotonic() - began < 0.5
    assert until_last(own)[-1].result == 64 * 2**20
    own.start(target("big"), (64,))
    longest, messages = 0.0, []
    while own.busy:
        began = time.monotonic()
        messages += own.poll()
        longest = max(longest, time.monotonic() - began)
        time.sleep(0.005)
    assert len(messages[-1].result) == 64 * 2**20
    assert longest < 0.5


def test_one_job_at_a_time(shared: ChildRunner) -> None:
    shared.start(target("polite"), ())
    with pytest.raises(RuntimeError, match="running"):
        shared.start(target("add"), (1, 1))
    shared.cancel()
    until_last(shared)


def test_a_polite_job_stops_itself_and_the_child_lives_on(shared: ChildRunner) -> None:
    shared.start(target("polite"), ())
    wait_for(shared, "improved")
    child = shared.process_id
    began = time.monotonic()
    shared.cancel()
    last = until_last(shared)[-1]
    assert time.monotonic() - began < 0.5
    assert (last.kind, last.answer) == ("cancelled", {"value": 1.5})
    assert run(shared, "surroundings")[-1].result[2] == child


def test_a_stopped_job_may_return_what_it_found(shared: ChildRunner) -> None:
    shared.start(target("keeps_its_best"), ())
    wait_for(shared, "progress")
    shared.cancel()
    last = until_last(shared)[-1]
    assert (last.kind, last.result) == ("done", "best so far")


def test_a_stop_does_not_reach_the_next_job(shared: ChildRunner) -> None:
    shared.start(target("add"), (1, 1))
    shared.cancel()
    until_last(shared)
    assert run(shared, "add", 4, 4)[-1].result == 8


def test_a_deaf_job_is_ended_within_half_a_second_and_keeps_its_answer(own: ChildRunner) -> None:
    own.start(target("deaf"), ())
    wait_for(own, "improved")
    child = own.process_id
    assert child is not None
    began = time.monotonic()
    own.cancel()
    last = until_last(own)[-1]
    assert time.monotonic() - began < 0.5
    assert (last.kind, last.answer) == ("cancelled", {"value": 2.5})
    assert own.process_id is None
    assert not Path(f"/proc/{child}").exists()
    # The next job gets a new child by itself.
    assert run(own, "add", 2, 2)[-1].result == 4


def test_a_cancellation_raised_inside(shared: ChildRunner) -> None:
    last = run(shared, "cancels_itself")[-1]
    assert (last.kind, last.answer) == ("cancelled", None)


def test_a_child_that_ends_unexpectedly_is_said_and_replaced(own: ChildRunner) -> None:
    last = run(own, "dies")[-1]
    assert last.kind == "failed"
    assert last.error is not None
    assert "unexpectedly" in last.error.problem
    assert run(own, "add", 2, 2)[-1].result == 4


def test_a_child_killed_while_idle_is_replaced(own: ChildRunner) -> None:
    run(own, "add", 1, 1)
    child = own.process_id
    assert child is not None
    os.kill(child, signal.SIGKILL)
    while own.process_id is not None:
        time.sleep(0.005)
    assert run(own, "add", 3, 3)[-1].result == 6


def test_a_failing_warm_up_does_not_stop_the_work() -> None:
    runner = ChildRunner(target("broken_warm"))
    try:
        assert run(runner, "add", 1, 2)[-1].result == 3
    finally:
        runner.close()


def test_the_warm_up_goes_on_between_jobs() -> None:
    runner = ChildRunner(target("warm_by_pieces"))
    try:
        marks = [run(runner, "surroundings")[-1].result[0]]
        deadline = time.monotonic() + 30.0
        while marks[-1] != "second" and time.monotonic() < deadline:
            marks.append(run(runner, "surroundings")[-1].result[0])
        assert marks[-1] == "second"
        assert set(marks) <= {"no", "first", "second"}
    finally:
        runner.close()


def test_close_leaves_nothing(own: ChildRunner) -> None:
    own.start(target("deaf"), ())
    wait_for(own, "improved")
    child = own.process_id
    own.close()
    own.close()
    assert not Path(f"/proc/{child}").exists()
    assert not own.busy
    assert own.poll() == []


def test_the_child_dies_with_a_killed_parent(tmp_path: Path) -> None:
    note = tmp_path / "child.txt"
    parent = subprocess.Popen([sys.executable, "-m", "tests.base.targets", str(note)], cwd=ROOT)
    try:
        until = time.monotonic() + PATIENCE
        while not note.exists() and time.monotonic() < until:
            time.sleep(0.01)
        child = int(note.read_text(encoding="ascii"))
        assert alive(child)
    finally:
        parent.kill()
        parent.wait()
    until = time.monotonic() + 5.0
    while alive(child) and time.monotonic() < until:
        time.sleep(0.01)
    assert not alive(child)


def test_the_child_dies_with_an_interrupted_parent_without_a_word(tmp_path: Path) -> None:
    """Ctrl-C in a terminal reaches parent and child; only the parent speaks of it."""
    note = tmp_path / "child.txt"
    parent = subprocess.Popen(
        [sys.executable, "-m", "tests.base.targets", str(note)],
        cwd=ROOT,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    until = time.monotonic() + PATIENCE
    while not note.exists() and time.monotonic() < until:
        time.sleep(0.01)
    child = int(note.read_text(encoding="ascii"))
    os.killpg(parent.pid, signal.SIGINT)
    said = parent.communicate(timeout=PATIENCE)[1]
    assert said.count("Traceback") == 1
    until = time.monotonic() + 5.0
    while alive(child) and time.monotonic() < until:
        time.sleep(0.01)
    assert not alive(child)
