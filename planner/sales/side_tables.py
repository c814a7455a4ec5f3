"""Shoppers, costs and ranges on the catalogue's axes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _
from planner.sales.checks import Ledger
from planner.sales.codes import CodeIndex
from planner.sales.matching import Matched
from planner.sales.money import decimal_marks, read_numbers
from planner.sales.weeks import Calendar, date_column, read_days

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Ranges:
    """in_range (S, W, J); named (S, J): the table has a row; today (S, J): in range in the last week."""

    in_range: Bools
    named: Bools
    today: Bools


@dataclass(frozen=True)
class Axes:
    """Where codes and weeks of side tables go.

    item (n,), store (m,): axis position of every known code, -1 when left out.
    replaced (n,): the code was replaced by a successor, whose position it has.
    start: the first week (see weeks.Days).
    """

    items: CodeIndex
    item: Ints
    replaced: Bools
    stores: CodeIndex
    store: Ints
    start: int
    n_weeks: int
    n_items: int
    n_stores: int


def positions(index: CodeIndex, axis: Ints, table: Matched, ours: str, ledger: Ledger) -> Ints:
    """Axis position (n,) of every row's code, -1 when left out; codes that nobody knows are reported."""
    known = index.find_all(table.column(ours))[0]
    ledger.note_rows("unknown_code", table.raw, np.flatnonzero(known < 0))
    return np.where(known >= 0, np.append(axis, -1)[known], -1)


@dataclass(frozen=True)
class RangeRows:
    """Usable rows of the ranges table: store axis, known item, first and last week (inclusive)."""

    store: Ints
    item: Ints
    first: Ints
    last: Ints

    def items_today(self, n_codes: int, n_weeks: int) -> Bools:
        """Known items (n_codes,) that some store lists in the last week."""
        now = (self.first < n_weeks) & (self.last >= n_weeks - 1)
        found = np.zeros(n_codes, dtype=bool)
        found[self.item[now]] = True
        return found


def read_range_rows(table: Matched, axes: Axes, calendar: Calendar, ledger: Ledger) -> RangeRows:
    """Ranges rows: inclusive; a blank first week means from the start, a blank last week still listed."""
    item = positions(axes.items, np.arange(axes.n_items), table, "item", ledger)
    store = positions(axes.stores, axes.store, table, "store", ledger)
    n = len(table.raw)
    first, last = np.zeros(n, dtype=np.int64), np.full(n, axes.n_weeks - 1, dtype=np.int64)
    usable = (item >= 0) & (store >= 0)
    for ours, target in (("first_week", first), ("last_week", last)):
        if table.has(ours):
            days = read_days(table, ours, table.column(ours), calendar)
            target[:] = np.where(days.blank, target, days.week - axes.start)
            note_unreadable(table, ours, days.bad, ledger)
            usable &= ~days.bad
    ledger.note_rows("backward_range", table.raw, np.flatnonzero(usable & (first > last)))
    usable &= first <= last
    return RangeRows(store[usable], axes.item[item[usable]], first[usable], last[usable])


def place_ranges(rows: RangeRows, position: Ints, axes: Axes) -> Ranges:
    """The ranges on the catalogue's axes; position (n_codes,): item axis of every known code."""
    item = position[rows.item]
    use = np.flatnonzero(item >= 0)
    item, store = item[use], rows.store[use]
    start = np.clip(rows.first[use], 0, axes.n_weeks)
    end = np.clip(rows.last[use] + 1, start, axes.n_weeks)
    steps = np.zeros((axes.n_stores, axes.n_weeks + 1, axes.n_items), dtype=np.int64)
    np.add.at(steps, (store, start, item), 1)
    np.add.at(steps, (store, end, item), -1)
    in_range = np.cumsum(steps, axis=1)[:, :-1] > 0
    named = np.zeros((axes.n_stores, axes.n_items), dtype=bool)
    named[store, item] = True
    return Ranges(in_range, named, in_range[:, -1])


def note_unreadable(table: Matched, ours: str, bad: Bools, ledger: Ledger) -> None:
    """Report the unreadable cells of a column."""
    rows = np.flatnonzero(bad)
    cells = table.column(ours).cells(rows)
    ledger.note_other(
        "unreadable_cell",
        [
            (table.raw.file, int(table.raw.rows[row]), f"{table.names[ours]}={cell}")
            for row, cell in zip(rows, cells, strict=True)
        ],
    )


def read_shoppers(
    table: Matched, axes: Axes, calendar: Calendar, opened: Bools, units: Floats, ledger: Ledger
) -> tuple[Floats | None, list[str]]:
    """(shoppers (S, W) or None when no row is usable, notes).

    units (S, W): category units, to fill stores without a count.
    Days are added up; a missing week takes the store's median; a store without any count takes its
    units times the chain's shoppers per unit.
    """
    ours, cells = date_column(table)
    days = read_days(table, ours, cells, calendar)
    mark = decimal_marks(table, ("shoppers",))["shoppers"]
    numbers = read_numbers(table.column("shoppers"), mark)
    note_unreadable(table, "shoppers", numbers.bad, ledger)
    store = positions(axes.stores, axes.store, table, "store", ledger)
    week = days.week.astype(np.int64) - axes.start
    use = (store >= 0) & (week >= 0) & (week < axes.n_weeks) & ~days.bad & ~days.blank
    repeated = table.raw.repeats()
    use &= (np.nan_to_num(numbers.values) > 0.0) & ~repeated
    found = _sums(numbers.values[use], store[use], week[use], (axes.n_stores, axes.n_weeks))
    notes: list[str] = []
    if repeated.any():
        notes.append(
            _("{n} rows of {file} repeat an earlier row exactly and are left out.").format(
                n=int(repeated.sum()), file=table.raw.file
            )
        )
    wanted = opened & np.isnan(found)
    counted: Bools = np.any(~np.isnan(found), axis=1)
    both = counted[:, None] & opened & (units > 0.0)
    if not both.any():
        return None, [_("No shopper count belongs to a store and week with sales; none is used.")]
    for s in np.flatnonzero(counted):
        found[s] = np.where(np.isnan(found[s]), np.nanmedian(found[s]), found[s])
    per_unit = float(found[both].sum() / units[both].sum())
    for s in np.flatnonzero(~counted):
        found[s] = np.maximum(units[s] * per_unit, 1.0)
    filled = int(wanted[counted].sum())
    if filled:
        notes.append(
            _("Shoppers are missing in {n} store-weeks; the store's median was taken.").format(n=filled)
        )
    if (~counted).any():
        notes.append(
            _("{n} stores have no shopper counts; the chain's shoppers per unit sold were taken.").format(
                n=int((~counted).sum())
            )
        )
    return found, notes


def _sums(values: Floats, store: Ints, week: Ints, shape: tuple[int, int]) -> Floats:
    """Sums (S, W) of the values, NaN where there is none."""
    cell, size = store * shape[1] + week, shape[0] * shape[1]
    total, count = np.bincount(cell, values, size), np.bincount(cell, minlength=size)
    return np.where(count > 0, total, np.nan).reshape(shape)
