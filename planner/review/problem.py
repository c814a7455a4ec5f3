"""From the user's limits to the arrays of the assortment problem."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import CallError
from planner.base.text import _, ngettext
from planner.optimise.problem import OUT, AssortmentProblem
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
    unknown = np.isnan(base.cost)
    if unknown.all():
        said = _("No cost is known, so the goal is sales instead of margin. Add costs to pursue margin.")
        return np.nan_to_num(base.net_price), "sales", (said,)
    notes: tuple[str, ...] = ()
    items = loaded.catalogue.items
    blank = [item.code for item, no_cost in zip(items, unknown, strict=True) if no_cost and not item.is_offer]
    if blank:
        said = ngettext(
            "{n} item has no cost and counts with margin 0: {items}. Add its cost.",
            "{n} items have no cost and count with margin 0: {items}. Add their costs.",
            len(blank),
        )
        notes = (said.format(n=len(blank), items=named(blank)),)
    return np.nan_to_num(base.margin), goal, notes


def named(codes: list[str], most: int = 10) -> str:
    """The first few codes and how many more there are."""
    if len(codes) <= most:
        return ", ".join(codes)
    return _("{names} and {n} more").format(names=", ".join(codes[:most]), n=len(codes) - most)


def _not_to_be_listed(loaded: LoadedData, fitted: FittedModel) -> tuple[Bools, tuple[str, ...]]:
    """(mask (J,) of items whose listing cannot be judged, notes).  None of them is on a list today.

    Offers need a price, and a cost once any cost is known; every item needs an estimate of demand.
    """
    base, items = loaded.base, loaded.catalogue.items
    offer = np.array([item.is_offer for item in items])
    unpriced = offer & ~(base.price > 0.0).all(axis=0)
    costless = offer & np.isnan(base.cost) & ~np.isnan(base.cost).all() & ~unpriced
    attraction = fitted.estimate.attraction[0]
    listed = base.today.any(axis=0)
    unknown = ~(np.isfinite(attraction) & (attraction > 0.0)).all(axis=0) & ~listed & ~unpriced & ~costless
    notes = []
    for mask, text in (
        (unpriced, _("Offers without a price are left out: {items}.")),
        (costless, _("Offers without a cost are left out: {items}.")),
        (unknown, _("Items whose demand cannot be estimated are not listed: {items}.")),
    ):
        codes = [item.code for item, out in zip(items, mask, strict=True) if out]
        if codes:
            notes.append(text.format(items=named(codes)))
    return unpriced | costless | unknown, tuple(notes)


def listed_again(loaded: LoadedData, states: NDArray[np.int8]) -> tuple[str, ...]:
    """A note on items of the plan ``states`` (C, J) that were sold before but are on no list today."""
    back = ~loaded.base.today.any(axis=0) & (states != OUT).any(axis=0)
    items = loaded.catalogue.items
    codes = [item.code for item, is_back in zip(items, back, strict=True) if is_back and not item.is_offer]
    if not codes:
        return ()
    said = _(
        "Sold before, on no list today, listed again by the plan: {items}. Lock as never what cannot be had."
    )
    return (said.format(items=named(codes)),)


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
    locked = [lock.cluster for lock in limits.locks if lock.cluster]
    for name in [*locked, *(limit.cluster for limit in limits.clusters)]:
        if name not in clusters:
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
    left_out, more = _not_to_be_listed(loaded, fitted)
    masks["never"] |= left_out
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
    return PosedProblem(problem, goal, (*notes, *more))
