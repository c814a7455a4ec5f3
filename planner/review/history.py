"""Undo and redo over immutable snapshots."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

from planner.plan.limits import Limits
from planner.plan.plans import NamedPlan, States

MOST_STEPS = 500

# Which kind of change stands for which part of a snapshot.
_KINDS = (("states", "states"), ("limits", "limits"), ("plans", "plans"), ("reasons", "states"))


@dataclass(frozen=True)
class Snapshot:
    """Everything that commands edit.  states (C, J) is never written into once it stands here."""

    states: States | None = None
    limits: Limits = field(default_factory=Limits)
    plans: tuple[NamedPlan, ...] = ()
    reasons: tuple[tuple[str, str, str], ...] = ()


def changed_kinds(before: Snapshot, after: Snapshot) -> frozenset[str]:
    """Kinds of what differs between two snapshots, and "history"."""
    # Snapshots share the parts that a command left alone.
    found = {kind for part, kind in _KINDS if getattr(before, part) is not getattr(after, part)}
    return frozenset(found | {"history"})


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

    def rewrite(self, change: Callable[[Snapshot], Snapshot]) -> None:
        """Apply ``change`` to every snapshot, before and after; nothing that undo would take back."""
        self.past = [(label, change(snapshot)) for label, snapshot in self.past]
        self.future = [(label, change(snapshot)) for label, snapshot in self.future]
        self.present = change(self.present)

    def restart(self, snapshot: Snapshot) -> None:
        """A new document: nothing to undo."""
        self.present = snapshot
        self.past.clear()
        self.future.clear()
