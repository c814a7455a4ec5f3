"""Sales rows: which are used, which are set aside, and what the used ones say."""

from __future__ import annotations

import re
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from planner.sales.checks import Ledger
from planner.sales.codes import CodeIndex
from planner.sales.columns import TextColumn
from planner.sales.matching import Matched
from planner.sales.money import Exact, Numbers, decimal_marks, read_flags, read_numbers
from planner.sales.successors import Joining
from planner.sales.weeks import Calendar, Days, date_column, read_days

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Positions = NDArray[np.int64] | NDArray[np.int32]
Bools = NDArray[np.bool_]

NUMBER_COLUMNS = (
    "units", "revenue", "revenue_net", "price", "regular_price", "cost", "days_on_sale", "days_out_of_stock",
)  # fmt: skip
_TOTAL = re.compile(
    r"^\W*(grand|sub|sum|category|store|overall|report)?[\s\-_]*(total|totals|subtotal|subtotals|summe|"
    r"gesamt|gesamtsumme|zwischensumme|totaal|totale|suma|somme)\b",
    re.IGNORECASE,
)
STRAY_GAP_WEEKS = 26
ABSURD_FACTOR = 10.0
# Above this share of rows that share store, day and item, the file holds single purchases.
PURCHASES_SHARE = 0.5
PURCHASES_ROWS = 1000


@dataclass(frozen=True)
class SalesRows:
    """The used rows (n,): positions and numbers; optional columns are None when the file has none.

    store: position in the index of stores; item: position in the index of items, successors joined;
    week, day: see weeks.Days; units: in units of the joined item; money: consumer money or net of VAT
    (``net_money``).  row: position in the file's table.
    """

    row: Ints
    store: Positions
    item: Positions
    week: Positions
    day: Positions
    units: Floats
    money: Floats
    net_money: bool
    daily: bool
    price: Floats | None
    regular_price: Floats | None
    promotion: Floats | None
    display: Floats | None
    cost: Floats | None
    on_sale: Floats | None
    days_on_sale: Floats | None
    days_out_of_stock: Floats | None

    def only(self, picked: Bools) -> SalesRows:
        """Some of the rows."""
        if picked.all():
            return self
        arrays = {
            field.name: getattr(self, field.name)[picked]
            for field in fields(self)
            if isinstance(getattr(self, field.name), np.ndarray)
        }
        return replace(self, **arrays)


@dataclass(frozen=True)
class ReadSales:
    """All rows of the file (n,) before any judgement."""

    table: Matched
    days: Days
    units: Numbers
    money: Exact
    money_values: Floats
    money_blank: Bools
    money_bad: Bools
    net_money: bool
    numbers: dict[str, Numbers]


def read_sales(table: Matched, calendar: Calendar) -> ReadSales:
    """Numbers and weeks of every sales row; money exact."""
    marks = decimal_marks(table, NUMBER_COLUMNS)
    numbers = {name: read_numbers(table.column(name), mark) for name, mark in marks.items()}
    ours, cells = date_column(table)
    days = read_days(table, ours, cells, calendar)
    units = numbers["units"]
    priced = next((name for name in ("price", "regular_price") if name in numbers), "")
    valued = next((name for name in ("revenue", "revenue_net") if name in numbers), "")
    if valued:
        money, values = numbers[valued].exact, numbers[valued].values
        blank, bad = numbers[valued].blank, numbers[valued].bad
        if priced and (blank & ~units.blank).any():
            product = numbers[priced].exact.times(units.exact)
            usable = blank & ~(numbers[priced].blank | numbers[priced].bad | units.bad | units.blank)
            money, blank = money.filled(product, usable), blank & ~usable
            values = np.where(usable, numbers[priced].values * units.values, values)
    else:
        money, values = numbers[priced].exact.times(units.exact), numbers[priced].values * units.values
        blank, bad = numbers[priced].blank, numbers[priced].bad
    return ReadSales(table, days, units, money, values, blank, bad, valued == "revenue_net", numbers)


def judge(
    read: ReadSales,
    ledger: Ledger,
    items: CodeIndex,
    stores: CodeIndex,
    other_category: Bools,
    joining: Joining,
    open_weeks: int,
) -> SalesRows:
    """Give every row its reason in the ledger, and return the rows in use.

    other_category (n,): rows that belong to a category that is not reviewed.
    open_weeks: a store without rows in the last so many weeks is closed.
    """
    table, days = read.table, read.days
    item_cells, store_cells = table.column("item"), table.column("store")
    if table.raw.crooked.size:
        ledger.set_aside("crooked_row", table.raw.crooked)
    ledger.set_aside("total_line", _total_lines(table))
    ledger.set_aside("other_category", other_category)
    ledger.set_aside("blank_code", _blank(item_cells) | _blank(store_cells))
    item, item_other = items.find_all(item_cells)
    store, store_other = stores.find_all(store_cells)
    ledger.set_aside("unknown_item", item < 0)
    ledger.set_aside("unknown_store", store < 0)
    ledger.set_aside("unreadable_week", days.bad | days.blank)
    ledger.set_aside("unreadable_number", read.units.bad | read.money_bad)
    ledger.set_aside("blank_number", read.units.blank | (read.money_blank & (read.units.values != 0.0)))
    ledger.set_aside("stray_week", _stray(days.week, ledger.used))
    _duplicates(read, ledger, item, store)
    for code, other in (("similar_code", item_other), ("similar_store_code", store_other)):
        if other.any():
            ledger.note(code, np.flatnonzero(other & ledger.used))
    units = read.units.values
    factor: Floats | None = None
    if joining.notes:
        known = np.maximum(item, 0)
        factor = joining.factor[known]
        ledger.note("successor_row", np.flatnonzero((joining.target[known] != known) & ledger.used))
        units = units * factor
        item = np.where(item >= 0, joining.target[known], item)
    _prices(ledger, item, units, read.money_values)
    _returns(ledger, item, store, days.week, units)
    ledger.set_aside("closed_store", _closed(days.week, store, ledger.used, open_weeks))
    return _used_rows(read, ledger.used, item, store, units, factor)


def _blank(column: TextColumn) -> Bools:
    return column.spread(np.zeros(len(column.values), dtype=bool), blank=True)


def _total_lines(table: Matched) -> Bools:
    """Rows whose item, store or week cell says total, or any cell when a code is blank."""
    n = len(table.raw)
    found = np.zeros(n, dtype=bool)
    for name in ("item", "store", "date", "week"):
        if table.has(name):
            found |= _says_total(table.column(name))
    blank = _blank(table.column("item")) | _blank(table.column("store"))
    if blank.any():
        rows = np.flatnonzero(blank)
        for header in table.raw.columns:
            found[rows] |= _says_total(table.raw.columns[header].take(rows))
    return found


def _says_total(column: TextColumn) -> Bools:
    return column.spread([bool(_TOTAL.match(text)) for text in column.texts()])


def _stray(week: Positions, used: Bools) -> Bools:
    """Rows in weeks that a long gap separates from the bulk of the history."""
    counts = np.bincount(week[used])
    weeks = np.flatnonzero(counts)
    part = np.concatenate([[0], np.cumsum(np.diff(weeks) > STRAY_GAP_WEEKS)])
    if part[-1] == 0 or weeks.size == 0:
        return np.zeros(week.size, dtype=bool)
    rows = np.bincount(part, counts[weeks])
    kept = weeks[(part == int(np.argmax(rows))) | (rows[part] > 0.01 * rows.sum())]
    return used & ~np.isin(week, kept)


def _duplicates(read: ReadSales, ledger: Ledger, item: Positions, store: Positions) -> None:
    """Exact repeats set aside, other rows of the same store, day and item reported."""
    rows = np.flatnonzero(ledger.used)
    day = read.days.day[rows]
    if rows.size == 0:
        return
    there = np.bincount(day - day.min()) > 0
    day = np.cumsum(there)[day - day.min()] - 1
    key = (store[rows].astype(np.int64) * (int(item.max()) + 1) + item[rows]) * int(there.sum()) + day
    twice = _repeated(key)
    if not twice.any():
        return
    suspects, keys = rows[twice], key[twice]
    if rows.size >= PURCHASES_ROWS and suspects.size > PURCHASES_SHARE * rows.size:
        ledger.note("conflicting_duplicate", suspects)
        return
    cells = pd.DataFrame(
        {k: column.codes[suspects] for k, column in enumerate(read.table.raw.columns.values())}
    )
    repeats = cells.duplicated(keep="first").to_numpy()
    exact = np.zeros(ledger.reason.size, dtype=bool)
    exact[suspects[repeats]] = True
    ledger.set_aside("duplicate_row", exact)
    left, left_keys = suspects[~repeats], keys[~repeats]
    # A return beside its sale is no conflict.
    sold = read.units.values[left] >= 0.0
    if sold.any():
        ledger.note("conflicting_duplicate", left[sold][_repeated(left_keys[sold])])


def _repeated(key: Positions) -> Bools:
    """Keys (n,) that stand in more than one row."""
    if int(key.max()) < max(4 * key.size, 1_000_000):
        twice: Bools = np.bincount(key)[key] > 1
    else:
        twice = pd.Series(key).duplicated(keep=False).to_numpy()
    return twice


def _prices(ledger: Ledger, item: Positions, units: Floats, money: Floats) -> None:
    """Contradictions between units and money, and prices far from the item's own median."""
    ledger.set_aside("sign_mismatch", units * money < 0.0)
    ledger.set_aside("zero_price", (units != 0.0) & (money == 0.0))
    ledger.set_aside("money_without_units", (units == 0.0) & (money != 0.0))
    rows = np.flatnonzero(ledger.used & (units != 0.0))
    if rows.size == 0:
        return
    price = money[rows] / units[rows]
    # A median needs no more than some hundred thousand rows.
    step = max(1, rows.size // 500_000)
    median = pd.Series(price[::step]).groupby(item[rows][::step]).median()
    middle = np.full(int(item.max()) + 1, np.nan)
    middle[median.index.to_numpy()] = median.to_numpy()
    ratio = price / middle[item[rows]]
    absurd = np.zeros(ledger.reason.size, dtype=bool)
    absurd[rows[(ratio > ABSURD_FACTOR) | (ratio < 1.0 / ABSURD_FACTOR)]] = True
    ledger.set_aside("absurd_price", absurd)


def _returns(ledger: Ledger, item: Positions, store: Positions, week: Positions, units: Floats) -> None:
    """Negative units stay when the week's sales cover them, else they are set aside."""
    returned = ledger.used & (units < 0.0)
    if not returned.any():
        return
    cell = pd.MultiIndex.from_arrays([store[returned], item[returned], week[returned]])
    rows = np.flatnonzero(ledger.used)
    wanted = np.isin(item[rows], np.unique(item[returned])) & np.isin(week[rows], np.unique(week[returned]))
    rows = rows[wanted]
    net = pd.Series(units[rows]).groupby([store[rows], item[rows], week[rows]]).sum()
    below = net.reindex(cell).to_numpy() < -1e-9
    beyond = np.zeros(ledger.reason.size, dtype=bool)
    beyond[np.flatnonzero(returned)[below]] = True
    ledger.set_aside("return_set_aside", beyond)
    ledger.note("return_netted", np.flatnonzero(returned & ~beyond))


def _closed(week: Positions, store: Positions, used: Bools, weeks: int) -> Bools:
    """Rows of stores whose last row lies before the last ``weeks`` weeks."""
    closed = np.zeros(week.size, dtype=bool)
    if not used.any():
        return closed
    latest = np.zeros(int(store.max()) + 1, dtype=np.int64)
    np.maximum.at(latest, store[used], week[used])
    gone = latest <= latest.max() - max(weeks, 1)
    closed[used] = gone[store[used]]
    return closed


def _used_rows(
    read: ReadSales, used: Bools, item: Positions, store: Positions, units: Floats, factor: Floats | None
) -> SalesRows:
    rows = np.flatnonzero(used)
    whole = rows.size == used.size
    table = read.table

    def pick(values: Any) -> Any:
        return values if whole else values[rows]

    def number(name: str, per_unit: bool = False) -> Floats | None:
        if name not in read.numbers:
            return None
        values: Floats = pick(read.numbers[name].values)
        return values / pick(factor) if per_unit and factor is not None else values

    def flag(name: str, text_is_yes: bool) -> Floats | None:
        if not table.has(name):
            return None
        value, unclear = read_flags(table.column(name))
        # The name of a promotion in a promotion column means that there was one.
        if text_is_yes and unclear.any():
            value = np.maximum(value, unclear.astype(np.float64))
        picked: Floats = pick(value)
        return picked

    return SalesRows(
        row=rows,
        store=pick(store),
        item=pick(item),
        week=pick(read.days.week),
        day=pick(read.days.day),
        units=pick(units),
        money=pick(read.money_values),
        net_money=read.net_money,
        daily=read.days.daily,
        price=number("price", per_unit=True),
        regular_price=number("regular_price", per_unit=True),
        promotion=flag("promotion", True),
        display=flag("display", True),
        cost=number("cost", per_unit=True),
        on_sale=flag("on_sale", False),
        days_on_sale=number("days_on_sale"),
        days_out_of_stock=number("days_out_of_stock"),
    )
