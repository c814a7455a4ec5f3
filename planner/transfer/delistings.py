"""Every single delisting at once: who gets the sales, what stays, what it costs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.demand.fitted import FittedModel
from planner.demand.store_demand import StoreDemand
from planner.sales.panel import BaseWeek
from planner.transfer.what_if import interval

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class DelistingTransfers:
    """One row per item delisted alone, in all stores.  Items not sold today: NaN.

    units (J,): today's units per week.  moved (J, J + 1): change of item k's units per week
    (own column: minus the item's units); last column: units that leave the category.
    stays (J,): share of the units that stays in the category, with 80 % interval.
    margin_change (J,): change of the category's margin per week, with 80 % interval.
    """

    units: Floats
    moved: Floats
    stays: Floats
    stays_low: Floats
    stays_high: Floats
    margin_change: Floats
    margin_low: Floats
    margin_high: Floats


@dataclass(frozen=True)
class _Single:
    """Factors of single removals for every draw, store and item (K, S, J).

    others: units of every item outside the segment are multiplied by it;
    inside: units of the remaining items of the segment are multiplied by it.
    units (K, S, J) and category, category_after: today's and after the removal.
    """

    units: Floats
    others: Floats
    inside: Floats
    category: Floats
    category_after: Floats


def _single_removals(demand: StoreDemand, present: Bools) -> _Single:
    """Closed form of recomputing the shares without item j, for every j at once."""
    parts = demand.parts(present)
    segment = demand.segment
    power = demand.power()[:, None, :][:, :, segment]
    units = demand.units(present)
    total = parts.total[:, :, segment]
    left = total - parts.shelf
    # An item alone in its segment leaves exactly nothing behind, whatever rounding says.
    alone = left <= 1e-12 * total
    safe_left = np.where(alone, 1.0, left)
    safe_total = np.where(total > 0.0, total, 1.0)
    before = (parts.total * parts.ratio)[:, :, segment]
    after = np.where(alone, 0.0, np.exp(power * np.log(safe_left)))
    inclusive = np.maximum(parts.inclusive[:, :, None] - before + after, 0.0)
    inclusive = np.where(present, inclusive, parts.inclusive[:, :, None])
    n_draws, n_stores, n_items = units.shape
    flat = np.moveaxis(inclusive, 2, 0).reshape(n_items, n_draws, n_stores)
    category_after = np.stack([demand.category_of(row) for row in flat], axis=2)
    rate = category_after / np.where(inclusive > 0.0, inclusive, 1.0)
    rate_before = (parts.category / np.where(parts.inclusive > 0.0, parts.inclusive, 1.0))[:, :, None]
    others = np.divide(rate, rate_before, out=np.ones_like(rate), where=rate_before > 0.0)
    shrink = np.where(alone, 0.0, np.exp((power - 1.0) * np.log(safe_left / safe_total)))
    inside = np.where(present, others * shrink, 1.0)
    return _Single(units, others, inside, parts.category, category_after)


def _moved(single: _Single, demand: StoreDemand, today: Bools) -> Floats:
    """(J, J + 1) of the first draw, summed over stores."""
    same = demand.segment[:, None] == demand.segment[None, :]
    units, others, inside = single.units[0], single.others[0], single.inside[0]
    outside_gain = (others - 1.0).T @ units
    inside_gain = (inside - 1.0).T @ units
    moved = np.where(same, inside_gain, outside_gain)
    total = (units * today).sum(axis=0)
    np.fill_diagonal(moved, -total)
    leaves = ((single.category[0][:, None] - single.category_after[0]) * today).sum(axis=0)
    table: Floats = np.column_stack([moved, leaves])
    return table


def _margin_change(single: _Single, demand: StoreDemand, margin: Floats) -> Floats:
    """(K, J): change of the category's margin when item j goes everywhere."""
    money = single.units * margin[demand.cluster][None]
    membership = demand.segment[:, None] == np.arange(demand.dissimilarity.shape[1])[None, :]
    in_segment = (money @ membership.astype(np.float64))[:, :, demand.segment]
    rest = money.sum(axis=2, keepdims=True) - in_segment
    change = rest * (single.others - 1.0) + (in_segment - money) * (single.inside - 1.0) - money
    summed: Floats = change.sum(axis=1)
    return summed


def delistings(fitted: FittedModel, base: BaseWeek) -> DelistingTransfers:
    """Delist every item alone, in all stores that have it today; exact, per store, summed."""
    today = base.today
    margin = np.nan_to_num(base.margin)
    estimate = _single_removals(fitted.estimate, today)
    sold: Bools = np.asarray(today.any(axis=0))
    units = estimate.units[0].sum(axis=0)
    safe = np.where(sold & (units > 0.0), units, np.nan)
    moved = np.where(sold[:, None], _moved(estimate, fitted.estimate, today), np.nan)
    draws = _single_removals(fitted.draws, today)
    draw_units = draws.units.sum(axis=1)
    lost = ((draws.category[:, :, None] - draws.category_after) * today[None]).sum(axis=1)
    stays = 1.0 - lost / np.where(draw_units > 0.0, draw_units, 1.0)
    low, high = interval(stays)
    change_low, change_high = interval(_margin_change(draws, fitted.draws, margin))
    change = _margin_change(estimate, fitted.estimate, margin)[0]
    blank: Floats = np.where(sold, 0.0, np.nan)
    return DelistingTransfers(
        units=np.where(sold, units, np.nan),
        moved=moved,
        stays=1.0 - moved[:, -1] / safe,
        stays_low=low + blank,
        stays_high=high + blank,
        margin_change=change + blank,
        margin_low=change_low + blank,
        margin_high=change_high + blank,
    )
