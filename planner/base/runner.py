"""One child process for long work: explicit spawn, pre-warmed, dies with its parent."""

from __future__ import annotations

import contextlib
import importlib
import multiprocessing
import os
import threading
import time
import traceback
from dataclasses import dataclass
from multiprocessing.connection import Connection
from multiprocessing.context import SpawnProcess
from multiprocessing.synchronize import Event
from typing import Any

from planner.base.errors import CancelledError, RangewrightError
from planner.base.text import _

GRACE_SECONDS = 0.3
_REPORTS_PER_SECOND = 20.0


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


class _PipeProgress:
    """Progress that writes to the pipe, not more often than a window can show."""

    def __init__(self, pipe: Connection, stop: Event) -> None:
        self._pipe, self._stop, self._last = pipe, stop, 0.0

    def report(self, step: str, fraction: float | None = None) -> None:
        now = time.monotonic()
        if now - self._last >= 1.0 / _REPORTS_PER_SECOND:
            self._last = now
            self._pipe.send(Message("progress", step, fraction))

    def improved(self, answer: dict[str, object]) -> None:
        self._pipe.send(Message("improved", answer=answer))

    def cancelled(self) -> bool:
        return self._stop.is_set()


def _die_with_parent(lifeline: Connection) -> None:
    """Block on the lifeline; its end means that the parent is gone."""
    with contextlib.suppress(EOFError, OSError):
        lifeline.recv()
    os._exit(0)


def _failure(error: Exception) -> RangewrightError:
    """The error as it crosses the pipe; an unexpected one brings its report."""
    if isinstance(error, RangewrightError):
        return error
    return RangewrightError(
        _("An unexpected error ({kind}): {error}").format(kind=type(error).__name__, error=error),
        place=traceback.format_exc(),
        remedy=_("Please report it with the lines above."),
    )


def _work(pipe: Connection, lifeline: Connection, stop: Event, warm: str) -> None:
    """The child's loop: one target after another until the pipe closes."""
    threading.Thread(target=_die_with_parent, args=(lifeline,), daemon=True).start()
    if warm:
        module, function = warm.split(":")
        getattr(importlib.import_module(module), function)()
    while True:
        try:
            target, arguments = pipe.recv()
        except (EOFError, OSError):
            return
        pipe.send(_answer(target, arguments, _PipeProgress(pipe, stop)))


def _answer(target: str, arguments: tuple[object, ...], progress: _PipeProgress) -> Message:
    """Run one target to its last message."""
    try:
        module, function = target.split(":")
        return Message(
            "done", result=getattr(importlib.import_module(module), function)(*arguments, progress)
        )
    except CancelledError:
        return Message("cancelled")
    except Exception as error:
        return Message("failed", error=_failure(error))


class ChildRunner:
    """Runs "package.module:function"(*arguments, progress) in one spawned process at a time.

    warm: "package.module:function" called once in a new child, to import the heavy parts early.
    Not thread-safe: start, poll, cancel and close belong to the thread that made it.
    """

    def __init__(self, warm: str = "") -> None:
        self._warm = warm
        self._context = multiprocessing.get_context("spawn")
        self._process: SpawnProcess | None = None
        self._busy = False
        self._last_answer: dict[str, object] | None = None
        self._cancel_at: float | None = None

    @property
    def busy(self) -> bool:
        """A target is running."""
        return self._busy

    @property
    def process_id(self) -> int | None:
        """Process number of the living child."""
        alive = self._process is not None and self._process.is_alive()
        return self._process.pid if alive and self._process is not None else None

    def warm_up(self) -> None:
        """Start the child now, so that the first job does not wait for it."""
        if self.process_id is None:
            self._spawn()

    def _spawn(self) -> None:
        self._pipe, theirs = self._context.Pipe()
        lifeline, self._lifeline = self._context.Pipe(duplex=False)
        self._stop = self._context.Event()
        # One thread per child: the solvers' own arithmetic is faster so on a busy machine.
        names = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS")
        before = {name: os.environ.get(name) for name in names}
        os.environ.update(dict.fromkeys(names, "1"))
        try:
            self._process = self._context.Process(
                target=_work, args=(theirs, lifeline, self._stop, self._warm), daemon=True
            )
            self._process.start()
        finally:
            for name, value in before.items():
                if value is None:
                    del os.environ[name]
                else:
                    os.environ[name] = value
        theirs.close()
        lifeline.close()

    def start(self, target: str, arguments: tuple[object, ...]) -> None:
        """Run a target; RuntimeError when one is running."""
        if self._busy:
            raise RuntimeError("A job is running in this child process already.")
        self.warm_up()
        self._stop.clear()
        self._busy, self._last_answer, self._cancel_at = True, None, None
        self._pipe.send((target, arguments))

    def poll(self) -> list[Message]:
        """Everything the child said since the last call; ends a cancelled child that does not stop."""
        messages: list[Message] = []
        while self._busy:
            try:
                if not self._pipe.poll():
                    break
                message = self._pipe.recv()
            except (EOFError, OSError):
                self._end()
                messages.append(self._died())
                break
            if message.kind == "improved":
                self._last_answer = message.answer
            if message.kind in ("done", "failed", "cancelled"):
                self._busy = False
                if message.kind == "cancelled":
                    message = Message("cancelled", answer=self._last_answer)
            messages.append(message)
        if self._busy and self._cancel_at is not None and time.monotonic() >= self._cancel_at:
            self._end()
            messages.append(Message("cancelled", answer=self._last_answer))
        return messages

    def _died(self) -> Message:
        if self._cancel_at is not None:
            return Message("cancelled", answer=self._last_answer)
        error = RangewrightError(
            _("The working process ended unexpectedly."),
            remedy=_("Try again; if it happens again, the machine may be short of memory."),
        )
        return Message("failed", error=error)

    def cancel(self) -> None:
        """Ask the target to stop; ``poll`` ends the process when it has not done so after 0.3 s."""
        if self._busy and self._cancel_at is None:
            self._stop.set()
            self._cancel_at = time.monotonic() + GRACE_SECONDS

    def _end(self) -> None:
        self._busy = False
        if self._process is not None:
            self._process.kill()
            self._process.join()
            self._process.close()
            self._process = None
            self._pipe.close()
            self._lifeline.close()

    def close(self) -> None:
        """End the child; nothing is left running."""
        self._end()
