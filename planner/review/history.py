"""Undo and redo over immutable snapshots."""

from __future__ import annotations

from dataclasses import dataclass, field

from planner.plan.limits import Limits
from planner.plan.plans import NamedPlan, States

MOST_STEPS = 500


@dataclass(frozen=True)
class Snapshot:
    """Everything that commands edit.  states (C, J) is never written into once it stands here."""

    states: States | None = None
    limits: Limits = field(default_factory=Limits)
    plans: tuple[NamedPlan, ...] = ()
    reasons: tuple[tuple[str, str, str], ...] = ()


@dataclass
class History:
    """The present snapshot with what lies before and after it, each with the label of its command."""

    present: Snapshot = field(default_factory=Snapshot)
    past: list[tuple[str, Snapshot]] = field(default_factory=list)
    future: list[tuple[str, Snapshot]] = field(default_factory=list)

    def do(self, label: str, snapshot: Snapshot) -> None:
        """Move on to ``snapshot``; what was undone before is gone."""
        self.past.append((label, self.present))
        del self.past[:-MOST_STEPS]
        self.future.clear()
        self.present = snapshot

    def undo(self) -> str:
        """Go back one command; its label."""
        label, before = self.past.pop()
        self.future.append((label, self.present))
        self.present = before
        return label

    def redo(self) -> str:
        """Do the last undone command again; its label."""
        label, after = self.future.pop()
        self.past.append((label, self.present))
        self.present = after
        return label

    def restart(self, snapshot: Snapshot) -> None:
        """A new document: nothing to undo."""
        self.present = snapshot
        self.past.clear()
        self.future.clear()
