"""One change set against today, without touching the plan in work."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import CallError
from planner.base.text import _
from planner.review.review import RangeReview
from planner.tables.receivers import receivers_table
from planner.tables.table import Table
from planner.transfer.tally import Tally, tally
from planner.transfer.what_if import IN, OUT


@dataclass(frozen=True)
class ChangeFromToday:
    """tally with its effects; changed (C, J): what was delisted, listed or repriced.

    leaves: part of the changed items' lost units that leaves the category, None when none are lost.
    """

    tally: Tally
    changed: NDArray[np.bool_]
    receivers: Table
    leaves: float | None


def _check_items(review: RangeReview, items: list[str]) -> None:
    index = review.need_loaded().catalogue.item_index()
    unknown = [item for item in items if item not in index]
    if unknown:
        raise CallError(
            _("Unknown item '{item}'.").format(item=unknown[0]),
            remedy=_("Use a code of the items table, with its leading zeros."),
        )


def change_from_today(
    review: RangeReview, delist: list[str], listed: list[str], prices: dict[str, float], cluster: str
) -> ChangeFromToday:
    """Delist, list and reprice from today, in one cluster or in all ("").

    An item that is not listed (or already listed) somewhere simply stays so there.  Raises
    CallError for unknown codes and clusters.
    """
    loaded, fitted = review.need_loaded(), review.need_fitted()
    _check_items(review, [*delist, *listed, *prices])
    clusters, index = loaded.catalogue.clusters, loaded.catalogue.item_index()
    if cluster and cluster not in clusters:
        raise CallError(
            _("Unknown cluster '{name}'.").format(name=cluster),
            remedy=_("Clusters are: {names}.").format(names=", ".join(clusters)),
        )
    rows = [clusters.index(cluster)] if cluster else list(range(len(clusters)))
    today = review.today_states()
    states = today.copy()
    for items, state in ((delist, OUT), (listed, IN)):
        for item in items:
            states[rows, index[item]] = state
    ratio = np.ones(loaded.base.price.shape)
    for item, price in prices.items():
        ratio[rows, index[item]] = price / loaded.base.price[rows, index[item]]
    changed = (states != today) | (ratio != 1.0)
    found = tally(fitted, loaded.base, states, ratio if prices else None)
    moved = found.effects.after - found.effects.before
    lost = -float(moved[changed].clip(max=0.0).sum())
    leaves = float(-moved.sum() / lost) if lost > 0.0 else None
    return ChangeFromToday(found, changed, receivers_table(loaded, found.effects, "units", changed), leaves)
