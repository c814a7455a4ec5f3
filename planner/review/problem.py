"""From the user's limits to the arrays of the assortment problem."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import CallError
from planner.base.text import _
from planner.optimise.problem import AssortmentProblem
from planner.plan.limits import GOALS, Limits

if TYPE_CHECKING:
    from planner.demand.fitted import FittedModel
    from planner.sales.report import LoadedData

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]

LOCKS = ("keep", "never", "as today")


@dataclass(frozen=True)
class PosedProblem:
    """The problem, the goal that is really pursued, and what was assumed, in words."""

    problem: AssortmentProblem
    goal: str
    notes: tuple[str, ...]


def goal_values(loaded: LoadedData, goal: str) -> tuple[Floats, str, tuple[str, ...]]:
    """Value of one unit (C, J), the goal pursued, notes.

    Without any cost the margin cannot be known and sales are pursued instead, aloud; items
    whose cost alone is missing count with margin 0 and are named.
    """
    base = loaded.base
    if goal not in GOALS:
        raise CallError(
            _("Unknown goal '{goal}'.").format(goal=goal),
            remedy=_("Use one of: {goals}.").format(goals=", ".join(GOALS)),
        )
    if goal == "units":
        return np.ones_like(base.price), goal, ()
    if goal == "sales":
        return np.nan_to_num(base.net_price), goal, ()
    missing = [
        item.code
        for item, cost in zip(loaded.catalogue.items, base.cost, strict=True)
        if not np.isfinite(cost)
    ]
    if len(missing) == len(loaded.catalogue.items):
        said = _("No cost is known, so the goal is sales instead of margin. Add costs to pursue margin.")
        return np.nan_to_num(base.net_price), "sales", (said,)
    notes: tuple[str, ...] = ()
    if missing:
        said = _("{n} items have no cost and count with margin 0: {items}. Add their costs.")
        notes = (said.format(n=len(missing), items=", ".join(missing[:10])),)
    return np.nan_to_num(base.margin), goal, notes


def check_codes(loaded: LoadedData, limits: Limits) -> None:
    """CallError when a limit names an item, cluster or kind of lock that does not exist."""
    items, clusters = loaded.catalogue.item_index(), loaded.catalogue.clusters
    for lock in limits.locks:
        if lock.item not in items:
            raise CallError(
                _("Unknown item '{item}' in a lock.").format(item=lock.item),
                remedy=_("Use a code of the items table."),
            )
        if lock.kind not in LOCKS:
            raise CallError(
                _("Unknown kind of lock '{kind}'.").format(kind=lock.kind),
                place=lock.item,
                remedy=_("Use one of: {kinds}.").format(kinds=", ".join(LOCKS)),
            )
    for name in [lock.cluster for lock in limits.locks] + [limit.cluster for limit in limits.clusters]:
        if name and name not in clusters:
            raise CallError(
                _("Unknown cluster '{name}'.").format(name=name),
                remedy=_("Clusters are: {names}.").format(names=", ".join(clusters)),
            )


def _locks(loaded: LoadedData, limits: Limits, listed: Bools) -> dict[str, Bools]:
    """Masks (C, J) per kind of lock; listed (C, J): anywhere in the cluster today.

    A keep without a cluster binds where the item is listed today, or everywhere when it is
    listed nowhere; the catalogue's keep flags are such keeps.
    """
    items, clusters = loaded.catalogue.item_index(), loaded.catalogue.clusters
    masks = {kind: np.zeros(listed.shape, dtype=bool) for kind in LOCKS}

    def keep_everywhere(j: int) -> None:
        masks["keep"][:, j] |= listed[:, j] if listed[:, j].any() else True

    for j, item in enumerate(loaded.catalogue.items):
        if item.keep:
            keep_everywhere(j)
        if item.is_offer and item.offered_to:
            masks["never"][:, j] |= np.array([name not in item.offered_to for name in clusters])
    for lock in limits.locks:
        j = items[lock.item]
        if lock.cluster:
            masks[lock.kind][clusters.index(lock.cluster), j] = True
        elif lock.kind == "keep":
            keep_everywhere(j)
        else:
            masks[lock.kind][:, j] = True
    return masks


def pose_problem(loaded: LoadedData, fitted: FittedModel, limits: Limits) -> PosedProblem:
    """The assortment problem under ``limits`` on today's base week."""
    check_codes(loaded, limits)
    base, catalogue = loaded.base, loaded.catalogue
    value, goal, notes = goal_values(loaded, limits.goal)
    cluster = fitted.estimate.cluster
    n_clusters = len(catalogue.clusters)
    listed = np.stack([base.today[cluster == c].any(axis=0) for c in range(n_clusters)])
    space = base.space_limit.copy()
    least, most = np.zeros(n_clusters), np.full(n_clusters, float(len(catalogue.items)))
    for limit in limits.clusters:
        c = catalogue.clusters.index(limit.cluster)
        if limit.space is not None:
            space[cluster == c] = np.minimum(space[cluster == c], limit.space)
        if limit.min_items is not None:
            least[c] = limit.min_items
        if limit.max_items is not None:
            most[c] = limit.max_items
    masks = _locks(loaded, limits, listed)
    problem = AssortmentProblem(
        demand=fitted.estimate,
        today=base.today,
        value=value,
        space=base.space_cm,
        space_limit=space,
        min_items=least,
        max_items=most,
        keep=masks["keep"],
        never=masks["never"],
        locked=masks["as today"],
        max_changes=limits.max_changes,
        listing_cost=limits.listing_cost,
        delisting_cost=limits.delisting_cost,
        cluster_names=catalogue.clusters,
        store_names=tuple(store.code for store in catalogue.stores),
    )
    return PosedProblem(problem, goal, notes)
