"""What of a review still holds when new data or a new fit come in, or a plan file is opened."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from planner.base.errors import PlanFileError
from planner.base.text import _, ngettext
from planner.plan.limits import Limits
from planner.plan.plans import NamedPlan, States
from planner.review.history import Snapshot
from planner.transfer.what_if import AS_TODAY

if TYPE_CHECKING:
    from planner.catalogue.items import Catalogue


def fitting_limits(limits: Limits, catalogue: Catalogue) -> Limits:
    """The limits without those of items and clusters that are no longer there."""
    items, clusters = catalogue.item_index(), catalogue.clusters
    return replace(
        limits,
        clusters=tuple(limit for limit in limits.clusters if limit.cluster in clusters),
        locks=tuple(
            lock
            for lock in limits.locks
            if lock.item in items and (not lock.cluster or lock.cluster in clusters)
        ),
    )


def same_axes(old: Catalogue, new: Catalogue) -> bool:
    """Items and clusters are the same, in the same order: states (C, J) keep their meaning."""
    return old.clusters == new.clusters and [i.code for i in old.items] == [i.code for i in new.items]


def _on_new_today(plan: NamedPlan, today: States) -> NamedPlan:
    """The plan on other data: "as today" means the new today, the solver's figures are gone."""
    states = np.where(plan.states == AS_TODAY, today, plan.states)
    return replace(plan, states=states, outcome=None, rungs=(), notes=_("Made on data loaded earlier."))


def marked_as_earlier_fit(snapshot: Snapshot) -> Snapshot:
    """Kept plans of a solver say that its figures are those of an earlier fit."""
    said = _("Searched under an earlier fit: value, bound and ladder are that fit's.")
    plans = tuple(
        plan
        if plan.outcome is None or said in plan.notes
        else replace(plan, notes=f"{plan.notes} {said}".strip())
        for plan in snapshot.plans
    )
    return replace(snapshot, plans=plans)


def carried_over(
    before: Snapshot, old: Catalogue | None, new: Catalogue, today: States
) -> tuple[Snapshot, str]:
    """(snapshot on new data, what was lost in words).

    The plan in work starts from the new ``today`` (C, J).  Kept plans stay when items and clusters
    are the same; their solver's figures, which speak of the earlier data, do not.
    """
    limits = fitting_limits(before.limits, new)
    lost = []
    gone = len(before.limits.locks) + len(before.limits.clusters) - len(limits.locks) - len(limits.clusters)
    if gone:
        said = ngettext(
            "{n} limit of an item or cluster that is no longer there",
            "{n} limits of items or clusters that are no longer there",
            gone,
        )
        lost.append(said.format(n=gone))
    if old is not None and same_axes(old, new):
        plans = tuple(_on_new_today(plan, today) for plan in before.plans)
        return Snapshot(today, limits, plans, before.reasons), "; ".join(lost)
    n = len(before.plans)
    if n:
        said = ngettext("{n} kept plan of other items", "{n} kept plans of other items", n)
        lost.append(said.format(n=n))
    items = new.item_index()
    reasons = tuple(entry for entry in before.reasons if entry[0] in items)
    return Snapshot(today, limits, (), reasons), "; ".join(lost)


def kept_reasons(settings: Mapping[str, object], path: Path) -> tuple[tuple[str, str, str], ...]:
    """The reasons that a plan file's settings hold.  Raises PlanFileError when they are something else."""
    found = []
    reasons = settings.get("reasons", ())
    entries = reasons if isinstance(reasons, list | tuple) else (reasons,)
    for entry in entries:
        if not isinstance(entry, list | tuple) or [type(part) for part in entry] != [str, str, str]:
            raise PlanFileError(
                _("the reasons in the plan file cannot be read."),
                place=str(path),
                remedy=_("Use an earlier copy of the file."),
            )
        found.append((entry[0], entry[1], entry[2]))
    return tuple(found)
