"""Sales rows: which are used, which are set aside, and what the used ones say."""

from __future__ import annotations

import re
from dataclasses import dataclass, fields, replace

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
    monday, day: ordinals; units: in units of the joined item; money: consumer money or net of VAT
    (``net_money``).  row: position in the file's table.
    """

    row: Ints
    store: Ints
    item: Ints
    monday: Ints
    day: Ints
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
        money = numbers[valued].exact
        blank, bad = numbers[valued].blank, numbers[valued].bad
        if priced and (blank & ~units.blank).any():
            product = numbers[priced].exact.times(units.exact)
            usable = blank & ~(numbers[priced].blank | numbers[priced].bad | units.bad | units.blank)
            money, blank = money.filled(product, usable), blank & ~usable
    else:
        money = numbers[priced].exact.times(units.exact)
        blank, bad = numbers[priced].blank, numbers[priced].bad
    return ReadSales(table, days, units, money, blank, bad, valued == "revenue_net", numbers)


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
    table, n = read.table, len(read.table.raw)
    item_cells, store_cells = table.column("item"), table.column("store")
    if table.raw.crooked.size == n:
        ledger.set_aside("crooked_row", table.raw.crooked)
    ledger.set_aside("total_line", _total_lines(table))
    ledger.set_aside("other_category", other_category)
    ledger.set_aside("blank_code", (item_cells.codes < 0) | (store_cells.codes < 0))
    item, item_other = items.find_all(item_cells)
    store, store_other = stores.find_all(store_cells)
    ledger.set_aside("unknown_item", item < 0)
    ledger.set_aside("unknown_store", store < 0)
    ledger.set_aside("unreadable_week", read.days.bad | read.days.blank)
    ledger.set_aside("unreadable_number", read.units.bad | read.money_bad)
    nothing = read.units.blank | (read.money_blank & (np.nan_to_num(read.units.values) != 0.0))
    ledger.set_aside("blank_number", nothing)
    ledger.set_aside("stray_week", _stray(read.days.monday, ledger.used))
    _duplicates(read, ledger, item, store)
    ledger.note("similar_code", np.flatnonzero(item_other & ledger.used))
    ledger.note("similar_store_code", np.flatnonzero(store_other & ledger.used))
    known = np.maximum(item, 0)
    ledger.note("successor_row", np.flatnonzero((joining.target[known] != known) & ledger.used))
    units = np.nan_to_num(read.units.values) * joining.factor[known]
    item = np.where(item >= 0, joining.target[known], item)
    money = np.asarray(read.money.minor, dtype=np.float64) / 10.0**read.money.scale
    _prices(ledger, item, units, money)
    _returns(ledger, item, store, read.days.monday, units)
    ledger.set_aside("closed_store", _closed(read.days.monday, store, ledger.used, open_weeks))
    return _used_rows(read, ledger.used, item, store, units, money, joining.factor[known])


def _total_lines(table: Matched) -> Bools:
    """Rows whose item, store or week cell says total, or any cell when a code is blank."""
    n = len(table.raw)
    found = np.zeros(n, dtype=bool)
    for name in ("item", "store", "date", "week"):
        if table.has(name):
            found |= _says_total(table.column(name))
    blank = (table.column("item").codes < 0) | (table.column("store").codes < 0)
    if blank.any():
        rows = np.flatnonzero(blank)
        for header in table.raw.columns:
            found[rows] |= _says_total(table.raw.columns[header].take(rows))
    return found


def _says_total(column: TextColumn) -> Bools:
    says = [bool(_TOTAL.match(text)) for text in column.texts()]
    result: Bools = np.array([*says, False])[column.codes]
    return result


def _stray(monday: Ints, used: Bools) -> Bools:
    """Rows in weeks that a long gap separates from the bulk of the history."""
    none = np.zeros(monday.size, dtype=bool)
    if not used.any():
        return none
    start = int(monday[used].min())
    counts = np.bincount(np.where(used, (monday - start) // 7, 0), used.astype(np.float64))
    weeks = np.flatnonzero(counts)
    part = np.concatenate([[0], np.cumsum(np.diff(weeks) > STRAY_GAP_WEEKS)])
    if part[-1] == 0:
        return none
    rows = np.bincount(part, counts[weeks])
    kept = weeks[(part == int(np.argmax(rows))) | (rows[part] > 0.01 * rows.sum())]
    return used & ~np.isin((monday - start) // 7, kept)


def _duplicates(read: ReadSales, ledger: Ledger, item: Ints, store: Ints) -> None:
    """Exact repeats set aside, other rows of the same store, day and item reported."""
    rows = np.flatnonzero(ledger.used)
    day = read.days.day[rows]
    if rows.size == 0:
        return
    there = np.bincount(day - day.min()) > 0
    day = np.cumsum(there)[day - day.min()] - 1
    key = (store[rows] * (int(item.max()) + 1) + item[rows]) * int(there.sum()) + day
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


def _repeated(key: Ints) -> Bools:
    """Keys (n,) that stand in more than one row."""
    if int(key.max()) < max(4 * key.size, 1_000_000):
        twice: Bools = np.bincount(key)[key] > 1
    else:
        twice = pd.Series(key).duplicated(keep=False).to_numpy()
    return twice


def _prices(ledger: Ledger, item: Ints, units: Floats, money: Floats) -> None:
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


def _returns(ledger: Ledger, item: Ints, store: Ints, monday: Ints, units: Floats) -> None:
    """Negative units stay when the week's sales cover them, else they are set aside."""
    returned = ledger.used & (units < 0.0)
    if not returned.any():
        return
    cell = pd.MultiIndex.from_arrays([store[returned], item[returned], monday[returned]])
    rows = np.flatnonzero(ledger.used)
    wanted = np.isin(item[rows], np.unique(item[returned])) & np.isin(
        monday[rows], np.unique(monday[returned])
    )
    rows = rows[wanted]
    net = pd.Series(units[rows]).groupby([store[rows], item[rows], monday[rows]]).sum()
    below = net.reindex(cell).to_numpy() < -1e-9
    beyond = np.zeros(ledger.reason.size, dtype=bool)
    beyond[np.flatnonzero(returned)[below]] = True
    ledger.set_aside("return_set_aside", beyond)
    ledger.note("return_netted", np.flatnonzero(returned & ~beyond))


def _closed(monday: Ints, store: Ints, used: Bools, weeks: int) -> Bools:
    """Rows of stores whose last row lies before the last ``weeks`` weeks."""
    closed = np.zeros(monday.size, dtype=bool)
    if not used.any():
        return closed
    latest = np.zeros(int(store.max()) + 1, dtype=np.int64)
    np.maximum.at(latest, store[used], monday[used])
    gone = latest <= latest.max() - 7 * max(weeks, 1)
    closed[used] = gone[store[used]]
    return closed


def _used_rows(
    read: ReadSales, used: Bools, item: Ints, store: Ints, units: Floats, money: Floats, factor: Floats
) -> SalesRows:
    rows = np.flatnonzero(used)
    table = read.table

    def number(name: str, per_unit: bool = False) -> Floats | None:
        if name not in read.numbers:
            return None
        values = read.numbers[name].values[rows]
        return values / factor[rows] if per_unit else values

    def flag(name: str, text_is_yes: bool) -> Floats | None:
        if not table.has(name):
            return None
        column = table.column(name).take(rows)
        value, unclear = read_flags(column)
        # The name of a promotion in a promotion column means that there was one.
        return np.maximum(value, unclear.astype(np.float64)) if text_is_yes else value

    return SalesRows(
        row=rows,
        store=store[rows],
        item=item[rows],
        monday=read.days.monday[rows],
        day=read.days.day[rows],
        units=units[rows],
        money=money[rows],
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
