"""One change set against today, without touching the plan in work."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import CallError
from planner.base.text import _
from planner.review.review import RangeReview
from planner.tables.receivers import cluster_positions, receivers_table
from planner.tables.table import Table
from planner.tables.transfer import transfer_table
from planner.transfer.tally import Tally, tally
from planner.transfer.what_if import IN, OUT


@dataclass(frozen=True)
class ChangeFromToday:
    """tally with its effects; changed (C, J): what was delisted, listed or repriced.

    transfer: the table of the transfer command; receivers: the one for people.
    leaves: (share, low, high) of the changed items' units that leaves the category (negative:
    comes into it), with its 80 % interval; None when nothing moves.
    """

    tally: Tally
    changed: NDArray[np.bool_]
    transfer: Table
    receivers: Table
    leaves: tuple[float, float, float] | None


def _states(
    review: RangeReview, delist: Sequence[str], listed: Sequence[str], rows: list[int]
) -> NDArray[np.int8]:
    """Today's states (C, J) with the changes made in the clusters ``rows``."""
    both = sorted(set(delist) & set(listed))
    if both:
        raise CallError(
            _("{item} is both delisted and listed.").format(item=both[0]), remedy=_("Name it once.")
        )
    states = review.today_states()
    for j in map(review.position, delist):
        states[rows, j] = OUT
    for j in map(review.position, listed):
        states[review.open_to(j, rows), j] = IN
    return states


def _price_ratio(review: RangeReview, prices: Mapping[str, float], rows: list[int]) -> NDArray[np.float64]:
    """New over today's regular price (C, J), 1 where nothing changes."""
    price = review.need_loaded().base.price
    ratio = np.ones(price.shape)
    for item in prices:
        j = review.position(item)
        if not (price[rows, j] > 0.0).all():
            raise CallError(
                _("{item} has no price today, so a new one cannot be compared.").format(item=item),
                remedy=_("Give it a price in the offers table."),
            )
        ratio[rows, j] = prices[item] / price[rows, j]
    # Today's price given again is no change, whatever its last digit.
    return np.where(np.abs(ratio - 1.0) < 1e-9, 1.0, ratio)


def change_from_today(
    review: RangeReview,
    delist: Sequence[str],
    listed: Sequence[str],
    prices: Mapping[str, float],
    cluster: str | None = None,
) -> ChangeFromToday:
    """Delist, list and reprice from today, in one cluster or in all (None).

    An item that is not listed (or already listed) somewhere simply stays so there; an offer is
    listed where it is offered.  Raises CallError for unknown codes and clusters.
    """
    loaded, fitted = review.need_loaded(), review.need_fitted()
    rows = cluster_positions(loaded.catalogue.clusters, cluster)
    states = _states(review, delist, listed, rows)
    ratio = _price_ratio(review, prices, rows)
    changed: NDArray[np.bool_] = (states != review.today_states()) | (ratio != 1.0)
    found = tally(fitted, loaded.base, states, ratio if prices else None)
    table = transfer_table(loaded.catalogue, found.effects, changed)
    last = [table.column(key).values[-1] for key in ("share", "low", "high")]
    leaves = tuple(float(part) for part in last if isinstance(part, float))
    return ChangeFromToday(
        found,
        changed,
        table,
        receivers_table(loaded, found.effects, "units", changed, cluster),
        (leaves[0], leaves[1], leaves[2]) if len(leaves) == 3 else None,
    )
