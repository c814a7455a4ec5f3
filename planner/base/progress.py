"""How long work reports progress and is told to stop."""

from __future__ import annotations

from typing import Protocol

from planner.base.errors import CancelledError


class Progress(Protocol):
    """Given to every long function.

    ``report`` names the step and how far it is (0..1, or None when unknown);
    ``improved`` streams a better answer (a small picklable mapping);
    ``cancelled`` is polled between pieces of work.
    """

    def report(self, step: str, fraction: float | None = None) -> None: ...

    def improved(self, answer: dict[str, object]) -> None: ...

    def cancelled(self) -> bool: ...


class NoProgress:
    """Progress that nobody watches."""

    def report(self, step: str, fraction: float | None = None) -> None:
        """Ignore the report."""

    def improved(self, answer: dict[str, object]) -> None:
        """Ignore the answer."""

    def cancelled(self) -> bool:
        """Never cancelled."""
        return False


def stop_if_cancelled(progress: Progress) -> None:
    """Raise CancelledError when the user has asked to stop."""
    if progress.cancelled():
        raise CancelledError("Cancelled.")
