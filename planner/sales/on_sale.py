"""On the shelf or not: an explicit flag, the ranges table, else inferred from the sales."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.sales.runs import Gaps, fill_forward, gaps, window_sum

Bools = NDArray[np.bool_]
Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class OnSaleSettings:
    """How gaps in the sales of an item in a store are read.

    gap_weeks: a gap inside the history of at most so many weeks is never out of stock.
    improbable: a gap whose chance at the item's own rate of sale (Poisson) is below this was no accident.
    rate_weeks: the rate is taken from so many weeks on either side of the gap.
    season_weeks: an improbable gap this long is a delisting and a new listing.
    bridge_weeks: at most so many empty weeks before a sale outside the range still belong to it.
    """

    gap_weeks: int = 2
    improbable: float = 0.001
    rate_weeks: int = 8
    season_weeks: int = 16
    bridge_weeks: int = 2


@dataclass(frozen=True)
class Shelf:
    """listed, on_shelf (S, W, J).

    outside (S, W, J): a row in a week outside the item's range.
    unnamed (S, J): sold, but the ranges table has no row for this store and item.
    """

    listed: Bools
    on_shelf: Bools
    outside: Bools
    unnamed: Bools


def rate_beside_gaps(units: Floats, seen: Bools, opened: Bools, weeks: int) -> Floats:
    """Units per week (W, P) in the ``weeks`` weeks with data before and after each gap; P pairs.

    Local, so that the low season of a seasonal item is not taken for an empty shelf.
    """
    total, span = np.zeros(seen.shape), np.zeros(seen.shape)
    for way in (slice(None), slice(None, None, -1)):
        here = seen[way]
        since_first = np.maximum.accumulate(here, axis=0) & opened[way]
        for sums, values in ((total, units[way]), (span, since_first.astype(np.float64))):
            beside = fill_forward(np.where(here, window_sum(values, weeks), np.nan))
            sums[way] += np.nan_to_num(beside)
    rate: Floats = total / np.maximum(span, 1.0)
    return rate


def improbable_gaps(
    units: Floats, seen: Bools, counted: Bools, found: Gaps, settings: OnSaleSettings
) -> tuple[Bools, Bools, Bools]:
    """Weeks (S, W, J) in improbable gaps: between rows, before the first row, after the last.

    seen: weeks with a row; counted (S, W): weeks in which the store has data; found: the gaps of seen.
    """
    inner = found.before & found.after
    candidate = ~seen & counted[:, :, None] & (found.before | found.after)
    candidate &= ~inner | (found.length > settings.gap_weeks)
    store, item = np.nonzero(candidate.any(axis=1))
    pairs = (store, slice(None), item)
    rate = rate_beside_gaps(units[pairs].T, seen[pairs].T, counted[store].T, settings.rate_weeks)
    chance = np.exp(-rate * found.length[pairs].T)
    unlikely = np.zeros(seen.shape, dtype=bool)
    unlikely[pairs] = (candidate[pairs].T & (chance < settings.improbable)).T
    return unlikely & inner, unlikely & ~found.before, unlikely & ~found.after


def writes_zero_rows(units: Floats, rows: Bools, counted: Bools) -> bool:
    """Whether the export has a row for weeks in which an item on the shelf was not sold.

    Compares the rows with zero units with the number that the rates of sale let expect.
    """
    zero_rows = int((rows & (units <= 0.0)).sum())
    if zero_rows < 20:
        return False
    found = gaps(rows, counted)
    span = (counted[:, :, None] & (rows | (found.before & found.after))).sum(axis=1)
    rate = units.sum(axis=1) / np.maximum(span, 1)
    expected = float((span * np.exp(-rate))[span > 0].sum())
    return zero_rows > 0.5 * expected


def infer_shelf(
    units: Floats, seen: Bools, counted: Bools, complete: bool, settings: OnSaleSettings
) -> tuple[Bools, Bools]:
    """(listed, on_shelf), each (S, W, J), from the rows alone.

    complete: a week without a row is a week off the shelf; otherwise only an improbable gap is.
    Listed runs from the first to the last row; a probable gap at either end belongs to it.  An
    improbable gap inside counts as out of stock, a very long one as off the range.
    """
    found = gaps(seen, counted)
    sold: Bools = np.any(seen, axis=1)[:, None, :]
    open_week = counted[:, :, None]
    if complete:
        inside = open_week & ~seen & found.before & found.after
        start, end = open_week & ~found.before, open_week & ~found.after
    else:
        inside, start, end = improbable_gaps(units, seen, counted, found, settings)
    away = start | end | (inside & (found.length >= settings.season_weeks))
    listed = open_week & sold & ~away
    return listed, listed & ~inside


def ranged_shelf(
    in_range: Bools, named: Bools, units: Floats, seen: Bools, counted: Bools, settings: OnSaleSettings
) -> Shelf:
    """The shelf by the ranges table; pairs of store and item that it does not name are inferred.

    in_range (S, W, J); named (S, J): the table has a row for the pair.  Rows outside the range count
    as on sale; a short empty gap between the range and such a row stays listed, off the shelf.
    """
    open_week = counted[:, :, None]
    own = named[:, None, :]
    outside = seen & ~in_range & own & open_week
    on_shelf = (in_range | outside) & open_week
    listed = on_shelf
    if outside.any():
        shelf_gaps, planned = gaps(on_shelf, counted), gaps(in_range & open_week, counted)
        bridge = ~on_shelf & own & open_week & shelf_gaps.before & shelf_gaps.after
        bridge &= (shelf_gaps.length <= settings.bridge_weeks) & (planned.length > shelf_gaps.length)
        listed = on_shelf | bridge
    unnamed = ~named & seen.any(axis=1)
    if unnamed.any():
        pick = unnamed[:, None, :]
        guess_listed, guess_shelf = infer_shelf(units, seen, counted, False, settings)
        listed, on_shelf = np.where(pick, guess_listed, listed), np.where(pick, guess_shelf, on_shelf)
    return Shelf(listed, on_shelf, outside, unnamed)
