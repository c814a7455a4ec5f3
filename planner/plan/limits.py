"""The limits of a plan, in the user's words (codes and names, no positions)."""

from __future__ import annotations

from dataclasses import dataclass

GOALS = ("margin", "sales", "units")


@dataclass(frozen=True)
class ItemLock:
    """An item that is kept, never listed, or left as today.

    kind: "keep" (must be on the list), "never" (must be off it), "as today".
    cluster: empty = every cluster.  reason and until (ISO date) are shown, not computed with.
    """

    item: str
    kind: str
    cluster: str = ""
    reason: str = ""
    until: str = ""


@dataclass(frozen=True)
class ClusterLimit:
    """Limits of one cluster; None: no limit of that kind beyond the stores' space."""

    cluster: str
    space: float | None = None
    min_items: int | None = None
    max_items: int | None = None


@dataclass(frozen=True)
class Limits:
    """All limits of a recommendation.  listing_cost, delisting_cost: money per change per week."""

    goal: str = "margin"
    max_changes: int | None = None
    clusters: tuple[ClusterLimit, ...] = ()
    locks: tuple[ItemLock, ...] = ()
    listing_cost: float = 0.0
    delisting_cost: float = 0.0
