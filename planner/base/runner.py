"""One child process for long work: explicit spawn, pre-warmed, dies with its parent."""

from __future__ import annotations

import contextlib
import importlib
import multiprocessing
import os
import signal
import threading
import time
import traceback
from collections.abc import Iterator
from dataclasses import dataclass
from multiprocessing.connection import Connection
from multiprocessing.context import SpawnProcess
from queue import Empty, SimpleQueue
from typing import Any

from planner.base.errors import CancelledError, RangewrightError
from planner.base.text import _

GRACE_SECONDS = 0.3
_REPORTS_PER_SECOND = 20.0
_LAST = ("done", "failed", "cancelled")
_THREAD_COUNTS = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS")


@dataclass(frozen=True)
class Message:
    """What the child says.

    kind: "progress" (step, fraction), "improved" (answer), "done" (result), "failed" (error),
    "cancelled" (answer: the last better answer, or None).
    """

    kind: str
    step: str = ""
    fraction: float | None = None
    answer: dict[str, object] | None = None
    result: Any = None
    error: RangewrightError | None = None


@dataclass(frozen=True)
class _Order:
    """number: of the job in this child; target: "package.module:function"."""

    number: int
    target: str
    arguments: tuple[object, ...]


# -- in the child ------------------------------------------------------------------------------


class _Stop:
    """The number of the last job that shall stop."""

    job = 0


class _PipeProgress:
    """Progress that writes to the pipe, not more often than a window can show.

    What comes too soon is held back and replaced by what comes next; nothing is lost at the end.
    """

    def __init__(self, pipe: Connection, stop: _Stop, job: int) -> None:
        self._pipe, self._stop, self._job = pipe, stop, job
        self._held: dict[str, Message] = {}
        self._due = 0.0

    def report(self, step: str, fraction: float | None = None) -> None:
        self._held["progress"] = Message("progress", step, fraction)
        self.flush()

    def improved(self, answer: dict[str, object]) -> None:
        self._held["improved"] = Message("improved", answer=answer)
        self.flush()

    def cancelled(self) -> bool:
        self.flush()
        return self._stop.job >= self._job

    def flush(self, now: bool = False) -> None:
        """Send what is held, when it is time (or at once)."""
        clock = time.monotonic()
        if self._held and (now or clock >= self._due):
            self._due = clock + 1.0 / _REPORTS_PER_SECOND
            for message in self._held.values():
                self._pipe.send(message)
            self._held.clear()


def _listen(lifeline: Connection, stop: _Stop) -> None:
    """Take the numbers of jobs to stop; the line's end means that the parent is gone."""
    with contextlib.suppress(EOFError, OSError):
        while True:
            stop.job = lifeline.recv()
    os._exit(0)


def _function(name: str) -> Any:
    module, function = name.split(":")
    return getattr(importlib.import_module(module), function)


def _failure(error: Exception) -> RangewrightError:
    """The error as it crosses the pipe; an unexpected one brings its report."""
    if isinstance(error, RangewrightError):
        return error
    return RangewrightError(
        _("an unexpected error ({kind}): {error}").format(kind=type(error).__name__, error=error),
        remedy=_("Nothing was changed. If it happens again, send the report to whoever looks after this."),
        report="".join(traceback.format_exception(error)),
    )


def _work(pipe: Connection, lifeline: Connection, warm: str) -> None:
    """The child's loop: one job after another until the pipe closes."""
    # Ctrl-C in the terminal reaches the whole group; the parent decides what ends here.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    stop = _Stop()
    threading.Thread(target=_listen, args=(lifeline, stop), daemon=True).start()
    pieces: Iterator[object] = iter(())
    if warm:
        # A job that needs what cannot be imported will say so with its own report.
        with contextlib.suppress(Exception):
            pieces = iter(_function(warm)() or ())
    with contextlib.suppress(EOFError, OSError):
        while True:
            _go_on_warming(pieces, pipe)
            order = pipe.recv()
            progress = _PipeProgress(pipe, stop, order.number)
            answer = _answer(order, progress)
            progress.flush(now=True)
            try:
                pipe.send(answer)
            except OSError:
                raise
            except Exception as error:
                pipe.send(Message("failed", error=_failure(error)))


def _go_on_warming(pieces: Iterator[object], pipe: Connection) -> None:
    """Take further pieces of the warm-up while no job is wanted."""
    while not pipe.poll():
        try:
            next(pieces)
        except StopIteration:
            return
        except Exception:
            # As above; a generator that failed has no further pieces.
            return


def _answer(order: _Order, progress: _PipeProgress) -> Message:
    """Run one job to its last message."""
    try:
        return Message("done", result=_function(order.target)(*order.arguments, progress))
    except CancelledError:
        return Message("cancelled")
    except Exception as error:
        return Message("failed", error=_failure(error))


# -- in the parent -----------------------------------------------------------------------------


def _carry(pipe: Connection, order: _Order, inbox: SimpleQueue[Message | None]) -> None:
    """Send the order and hand on what the child says, to its last message; None: the child is gone.

    Runs in a thread: large arguments and results take longer through a pipe than a window may wait.
    """
    try:
        pipe.send(order)
        while True:
            message = pipe.recv()
            inbox.put(message)
            if message.kind in _LAST:
                return
    except (EOFError, OSError):
        inbox.put(None)
    except Exception as error:
        inbox.put(Message("failed", error=_failure(error)))


@contextlib.contextmanager
def _one_thread_each() -> Iterator[None]:
    """Environment of a new child: BLAS on one thread, the faster way beside another busy process."""
    before = {name: os.environ.get(name) for name in _THREAD_COUNTS}
    os.environ.update(dict.fromkeys(_THREAD_COUNTS, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                del os.environ[name]
            else:
                os.environ[name] = value


class ChildRunner:
    """Runs "package.module:function"(*arguments, progress) in one spawned process, one at a time.

    warm: "package.module:function" called once in a new child, to import the heavy parts early.  When it
    is a generator, a job that is wanted goes before the pieces that are left.
    Belongs to the thread that made it.  No call waits for the child, except ``close`` and the end
    of a cancelled job, which kill it first.
    """

    def __init__(self, warm: str = "") -> None:
        self._warm = warm
        self._context = multiprocessing.get_context("spawn")
        self._process: SpawnProcess | None = None
        self._courier: threading.Thread | None = None
        self._inbox: SimpleQueue[Message | None] = SimpleQueue()
        self._jobs = 0
        self._busy = False
        self._last_answer: dict[str, object] | None = None
        self._cancel_at: float | None = None

    @property
    def busy(self) -> bool:
        """A job is running."""
        return self._busy

    @property
    def process_id(self) -> int | None:
        """Process number of the living child."""
        return self._process.pid if self._process is not None and self._process.is_alive() else None

    def warm_up(self) -> None:
        """Start the child now, so that the first job does not wait for it."""
        if self.process_id is None:
            self._end()
            self._spawn()

    def _spawn(self) -> None:
        self._pipe, theirs = self._context.Pipe()
        lifeline, self._lifeline = self._context.Pipe(duplex=False)
        self._jobs = 0
        process = self._context.Process(target=_work, args=(theirs, lifeline, self._warm), daemon=True)
        with _one_thread_each():
            process.start()
        self._process = process
        theirs.close()
        lifeline.close()

    def start(self, target: str, arguments: tuple[object, ...]) -> None:
        """Run a job; RuntimeError when one is running.  The arguments must not change meanwhile."""
        if self._busy:
            raise RuntimeError("A job is running in this child process already.")
        self.warm_up()
        self._jobs += 1
        self._busy, self._last_answer, self._cancel_at = True, None, None
        self._inbox = SimpleQueue()
        order = _Order(self._jobs, target, arguments)
        self._courier = threading.Thread(
            target=_carry, args=(self._pipe, order, self._inbox), name="courier", daemon=True
        )
        self._courier.start()

    def poll(self) -> list[Message]:
        """Everything the child said since the last call; ends a cancelled child that does not stop."""
        messages = self._heard()
        if self._busy and self._cancel_at is not None and time.monotonic() >= self._cancel_at:
            self._end()
            # What it managed to say before its end; without a last word it counts as cancelled.
            messages += self._heard()
        return messages

    def _heard(self) -> list[Message]:
        messages: list[Message] = []
        while self._busy:
            try:
                message = self._inbox.get_nowait()
            except Empty:
                break
            if message is None:
                message = self._gone()
            if message.kind == "improved":
                self._last_answer = message.answer
            if message.kind == "cancelled":
                message = Message("cancelled", answer=self._last_answer)
            self._busy = message.kind not in _LAST
            messages.append(message)
        return messages

    def _gone(self) -> Message:
        """The last message of a job whose process ended."""
        if self._cancel_at is not None:
            return Message("cancelled")
        self._end()
        return Message(
            "failed",
            error=RangewrightError(
                _("the working process ended unexpectedly."),
                remedy=_("Try again; if it happens again, the machine may be short of memory."),
            ),
        )

    def cancel(self) -> None:
        """Ask the job to stop; ``poll`` ends the process when it has not done so after 0.3 s."""
        if self._busy and self._cancel_at is None:
            self._cancel_at = time.monotonic() + GRACE_SECONDS
            with contextlib.suppress(OSError):
                self._lifeline.send(self._jobs)

    def _end(self) -> None:
        """Kill the child, whatever it does, and clear up after it."""
        if self._process is None:
            return
        self._process.kill()
        self._process.join()
        if self._courier is not None:
            # The child's end of the pipe is closed, so the courier is on its way out.
            self._courier.join()
            self._courier = None
        self._process.close()
        self._process = None
        self._pipe.close()
        self._lifeline.close()

    def close(self) -> None:
        """End the child; nothing is left running.  A job that runs gets no last message."""
        self._end()
        self._busy = False
