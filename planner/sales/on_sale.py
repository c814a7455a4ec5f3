"""On the shelf or not: an explicit flag, the ranges table, else inferred from the sales."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.sales.runs import gaps

Bools = NDArray[np.bool_]
Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class OnSaleSettings:
    """gap_weeks: a gap this long is never out of stock.  improbable: a gap whose chance under the item's
    own rate of sale (Poisson) is below this was no accident.  season_weeks: an improbable gap this long
    is a delisting and a new listing.  bridge_weeks: at most so many empty weeks before a sale outside
    the range still belong to it.
    """

    gap_weeks: int = 2
    improbable: float = 0.001
    season_weeks: int = 16
    bridge_weeks: int = 2


@dataclass(frozen=True)
class Shelf:
    """listed, on_shelf (S, W, J).  outside: sold outside the range.  missing: listed, yet so long
    without a sale that it was out of stock.  unnamed (S, J): sold, but not in the ranges table.
    """

    listed: Bools
    on_shelf: Bools
    outside: Bools
    missing: Bools
    unnamed: Bools


def rate_of_sale(units: Floats, seen: Bools, counted: Bools, gap_weeks: int) -> Floats:
    """Units per week (S, J) between first and last sale, long gaps left out."""
    length, before, after = gaps(seen, counted)
    open_week = counted if counted.ndim == 3 else counted[:, :, None]
    inside = open_week & (seen | (before & after & (length <= gap_weeks)))
    weeks = inside.sum(axis=1)
    rate: Floats = units.sum(axis=1) / np.maximum(weeks, 1)
    return rate


def improbable_gaps(
    units: Floats, seen: Bools, counted: Bools, settings: OnSaleSettings
) -> tuple[Bools, Bools, Bools]:
    """Weeks (S, W, J) in gaps that are improbable: inside the history, before the first row, after the last."""
    length, before, after = gaps(seen, counted)
    rate = rate_of_sale(units, seen, counted, settings.gap_weeks)[:, None, :]
    chance = np.exp(-rate * length)
    open_week = counted if counted.ndim == 3 else counted[:, :, None]
    unlikely = open_week & ~seen & (chance < settings.improbable)
    inside = unlikely & before & after & (length > settings.gap_weeks)
    return inside, unlikely & ~before & after, unlikely & before & ~after


def writes_zero_rows(units: Floats, rows: Bools, counted: Bools) -> bool:
    """Whether the export has a row for weeks in which an item on the shelf was not sold.

    Compares the rows with zero units with the number that the rates of sale let expect.
    """
    zero_rows = int((rows & (units <= 0.0)).sum())
    if zero_rows < 20:
        return False
    length, before, after = gaps(rows, counted)
    span = (counted[:, :, None] & (rows | (before & after))).sum(axis=1)
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
    length, before, after = gaps(seen, counted)
    sold = seen.any(axis=1)[:, None, :]
    open_week = counted[:, :, None]
    if complete:
        inside = open_week & ~seen & before & after
        start, end = open_week & ~before, open_week & ~after
    else:
        inside, start, end = improbable_gaps(units, seen, counted, settings)
    away = start | end | (inside & (length >= settings.season_weeks))
    listed = open_week & sold & ~away
    return listed, listed & ~inside


def ranged_shelf(
    in_range: Bools, named: Bools, units: Floats, seen: Bools, counted: Bools, settings: OnSaleSettings
) -> Shelf:
    """The shelf by the ranges table; pairs of store and item that it does not name are inferred.

    in_range (S, W, J); named (S, J): the table has a row for the pair.  Sales outside the range count
    as on sale; a short empty gap between the range and such a sale stays listed, off the shelf.
    """
    open_week = counted[:, :, None]
    own = named[:, None, :]
    outside = seen & ~in_range & own & open_week
    base = (in_range | outside) & open_week
    length, before, after = gaps(base, counted)
    lasting = gaps(in_range & open_week, counted)
    joined = (
        ~base & own & open_week & before & after & (length <= settings.bridge_weeks) & (lasting[0] > length)
    )
    # Only weeks in the range count: an item is not missing while it is delisted.
    inside, start, end = improbable_gaps(units, seen, base, settings)
    missing = base & (inside | start | end)
    listed, on_shelf = base | joined, base & ~missing
    guess_listed, guess_shelf = infer_shelf(units, seen, counted, False, settings)
    unnamed = ~named & seen.any(axis=1)
    pick = unnamed[:, None, :]
    return Shelf(
        np.where(pick, guess_listed, listed),
        np.where(pick, guess_shelf, on_shelf),
        outside,
        missing & own,
        unnamed,
    )
