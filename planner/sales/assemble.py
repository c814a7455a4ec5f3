"""From matched tables to loaded data, step by step: rows, catalogue, panel, base week, report."""

from __future__ import annotations

from dataclasses import dataclass, replace
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import DataError
from planner.base.progress import Progress, stop_if_cancelled
from planner.base.text import _
from planner.catalogue.items import Catalogue, Store
from planner.sales.base_week import WeekInputs, build_base
from planner.sales.build_catalogue import (
    KnownItems,
    build_catalogue,
    known_items,
    rows_of_other_categories,
    with_known_clusters,
)
from planner.sales.build_panel import (
    Cubes,
    bridge_successors,
    build_cubes,
    build_panel,
    find_shelf,
    listing_events,
)
from planner.sales.checks import Ledger
from planner.sales.codes import code_index
from planner.sales.costs import cost_from_sales, read_costs
from planner.sales.item_tables import read_items, read_stores
from planner.sales.matching import Matched
from planner.sales.on_sale import OnSaleSettings, Shelf
from planner.sales.panel import BaseWeek, MarketPanel
from planner.sales.prices import PriceSettings
from planner.sales.report import LoadedData, LoadReport
from planner.sales.request import LoadRequest
from planner.sales.rows import SalesRows, judge, read_sales
from planner.sales.side_tables import (
    Axes,
    RangeRows,
    Ranges,
    place_ranges,
    read_range_rows,
    read_shoppers,
)
from planner.sales.successors import Joining, read_successors
from planner.sales.weeks import Calendar, date_column, settle_calendar

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

SUCCESSOR_GAP_WEEKS = 8


@dataclass(frozen=True)
class JudgedRows:
    """The sales rows in use, and every code the tables name."""

    request: LoadRequest
    tables: dict[str, Matched]
    calendar: Calendar
    ledger: Ledger
    known: KnownItems
    joining: Joining
    rows: SalesRows
    stores: list[Store]
    category: str
    weighed: bool


@dataclass(frozen=True)
class Placed:
    """The same on the catalogue's axes."""

    judged: JudgedRows
    catalogue: Catalogue
    axes: Axes
    ranges: Ranges | None
    cubes: Cubes


def judge_rows(request: LoadRequest, tables: dict[str, Matched]) -> JudgedRows:
    """Read weeks, money and codes, and give every sales row its reason."""
    sales, items_table = tables["sales"], tables["items"]
    if not request.segment_by and not items_table.has("segment"):
        raise DataError(
            _("no column was recognised as segment; the file's columns are: {columns}.").format(
                columns=items_table.raw.headers()
            ),
            place=items_table.raw.file,
            remedy=_("Say which with --match items.segment=NAME, or build them with --segment-by COLUMN."),
        )
    ours, cells = date_column(sales)
    calendar = settle_calendar(sales, ours, cells)
    read = read_sales(sales, calendar)
    ledger = Ledger(sales.raw, read.money, np.zeros(len(sales.raw), dtype=np.int16))
    items = read_items(items_table, ledger, request.segment_by, offers=False)
    offers = []
    if "offers" in tables:
        offers = read_items(tables["offers"], ledger, request.segment_by, offers=True)
    known = known_items(items, offers, tables.get("successors"))
    joining = read_successors(tables.get("successors"), known.index, known.codes)
    category, other = rows_of_other_categories(sales, known, request.category)
    stores = read_stores(tables.get("stores"), sales.column("store").texts(), ledger)
    store_index = code_index([store.code for store in stores])
    rows = judge(read, ledger, known.index, store_index, other, joining, request.baseline_weeks)
    weighed = read.units.exact.has_fractions()
    return JudgedRows(request, tables, calendar, ledger, known, joining, rows, stores, category, weighed)


def place_on_axes(judged: JudgedRows) -> Placed:
    """The catalogue, and rows and ranges on its axes."""
    known, joining, rows, tables = judged.known, judged.joining, judged.rows, judged.tables
    n_codes = len(known.codes)
    used_stores = np.flatnonzero(np.bincount(rows.store, minlength=len(judged.stores)))
    store_axis = np.full(len(judged.stores), -1, dtype=np.int64)
    store_axis[used_stores] = np.arange(used_stores.size)
    start = int(rows.week.min()) if rows.row.size else 0
    n_weeks = int(rows.week.max()) - start + 1 if rows.row.size else 0
    codes = Axes(
        items=known.index,
        item=joining.target,
        replaced=joining.target != np.arange(n_codes),
        stores=code_index([store.code for store in judged.stores]),
        store=store_axis,
        start=start,
        n_weeks=n_weeks,
        n_items=n_codes,
        n_stores=int(used_stores.size),
    )
    sold, ranged = np.zeros(n_codes, dtype=bool), np.zeros(n_codes, dtype=bool)
    sold[rows.item[rows.units > 0.0]] = True
    range_rows: RangeRows | None = None
    if "ranges" in tables and n_weeks:
        range_rows = read_range_rows(tables["ranges"], codes, judged.calendar, judged.ledger)
        ranged = range_rows.items_today(n_codes, n_weeks)
    catalogue, position = build_catalogue(
        judged.category,
        known,
        [judged.stores[s] for s in used_stores],
        sold,
        ranged,
        joining.target,
        judged.ledger,
    )
    axes = replace(codes, item=position[joining.target], n_items=len(catalogue.items))
    ranges = place_ranges(range_rows, position, axes) if range_rows is not None else None
    # Rows of an item that never sold a unit (zero rows only) have no place on the item axis.
    item = axes.item[rows.item]
    rows = rows.only(item >= 0)
    cubes = build_cubes(
        rows, store_axis[rows.store], item[item >= 0], len(catalogue.stores), len(catalogue.items)
    )
    return Placed(replace(judged, rows=rows), catalogue, axes, ranges, cubes)


def _shelf(placed: Placed, notes: list[str]) -> Shelf:
    """What was on the shelf; sales outside the ranges reported."""
    judged, axes = placed.judged, placed.axes
    shelf, words = find_shelf(placed.cubes, placed.ranges, OnSaleSettings())
    notes.append(words)
    target = judged.joining.target
    heirs = np.unique(axes.item[target[target != np.arange(target.size)]])
    bridged = bridge_successors(shelf.listed, placed.cubes.open, heirs[heirs >= 0], SUCCESSOR_GAP_WEEKS)
    shelf = replace(shelf, listed=bridged)
    empty = int((shelf.listed & ~shelf.on_shelf).sum())
    if empty:
        notes.append(_("{n} item-store-weeks of listed items count as out of stock.").format(n=empty))
    rows = judged.rows
    if shelf.outside.any() or shelf.unnamed.any():
        week = rows.week - axes.start
        store, item = axes.store[rows.store], axes.item[rows.item]
        judged.ledger.note("outside_range", rows.row[shelf.outside[store, week, item]])
        judged.ledger.note("not_in_ranges", rows.row[shelf.unnamed[store, item]])
    return shelf


def _panel(placed: Placed, notes: list[str]) -> MarketPanel:
    judged, cubes = placed.judged, placed.cubes
    shelf = _shelf(placed, notes)
    shoppers = None
    if "shoppers" in judged.tables:
        shoppers, said = read_shoppers(
            judged.tables["shoppers"],
            placed.axes,
            judged.calendar,
            cubes.open,
            cubes.units.sum(axis=2),
            judged.ledger,
        )
        notes += said
    return build_panel(placed.catalogue, cubes, shelf, shoppers, judged.rows.net_money, PriceSettings())


def _base(placed: Placed, panel: MarketPanel, notes: list[str]) -> BaseWeek:
    judged, catalogue, axes, cubes = placed.judged, placed.catalogue, placed.axes, placed.cubes
    today = None
    if placed.ranges is not None:
        last = np.zeros(len(catalogue.stores), dtype=np.int64)
        last[panel.store_index] = np.arange(panel.n_markets)
        today = np.where(placed.ranges.named, placed.ranges.today, panel.listed[last])
    weeks = min(max(judged.request.baseline_weeks, 1), len(panel.weeks))
    cost = np.full(len(catalogue.items), np.nan)
    if "costs" in judged.tables:
        cost, said = read_costs(judged.tables["costs"], axes, judged.calendar, judged.ledger)
        notes += said
    from_sales = cost_from_sales(cubes.cost, cubes.units, weeks, cost.size)
    given = np.array([np.nan if item.cost is None else item.cost for item in catalogue.items])
    for other in (from_sales, given):
        cost = np.where(np.isnan(cost), other, cost)
    rate = np.full(cost.size, np.nan)
    for k, row in enumerate(judged.known.rows):
        if row is not None and row.margin_rate is not None and axes.item[k] >= 0 and not axes.replaced[k]:
            rate[axes.item[k]] = row.margin_rate
    return build_base(catalogue, panel, WeekInputs(today, cost, rate, cubes.part), weeks)


def _last_checks(placed: Placed, base: BaseWeek) -> None:
    """Checks that need prices and costs side by side."""
    ledger, catalogue = placed.judged.ledger, placed.catalogue
    file = placed.judged.tables["items"].raw.file
    with np.errstate(invalid="ignore"):
        matters = base.today.any(axis=0) | np.array([item.is_offer for item in catalogue.items])
        dear = np.flatnonzero((base.margin < 0.0).any(axis=0) & matters)
    ledger.note_other("cost_above_price", [(file, 0, catalogue.items[j].code) for j in dear])
    cut = np.flatnonzero(placed.cubes.part < 1.0)
    if cut.size:
        rows = placed.judged.rows
        week = rows.week - placed.axes.start
        ledger.note("part_week", rows.row[np.isin(week, cut)])


def _said_about_history(placed: Placed, panel: MarketPanel) -> list[str]:
    notes = []
    missing = int((~placed.cubes.open).sum())
    if missing:
        notes.append(_("{n} store-weeks hold no sales at all and are left out.").format(n=missing))
    if placed.judged.rows.net_money:
        notes.append(_("Sales are net of VAT; consumer prices are sales with VAT added."))
    elif any(item.vat_rate for item in placed.catalogue.items):
        notes.append(_("VAT rates are known: sales are taken as consumer money with VAT inside."))
    if placed.judged.weighed:
        notes.append(_("Some units are fractions (weighed items): they count as content sold."))
    if "stores" not in placed.judged.tables:
        notes.append(_("No stores table: all stores are one cluster."))
    if "shoppers" not in placed.judged.tables:
        notes.append(_("No shoppers table: the category's volume stands in for shoppers."))
    sold_out = [store.code for store in placed.judged.stores]
    unused = len(sold_out) - len(placed.catalogue.stores)
    if unused:
        notes.append(_("{n} stores without usable sales are left out.").format(n=unused))
    return notes


def assemble(placed: Placed, progress: Progress) -> LoadedData:
    """Panel, base week and report."""
    judged, ledger = placed.judged, placed.judged.ledger
    notes = list(judged.joining.notes)
    panel = _panel(placed, notes)
    stop_if_cancelled(progress)
    progress.report(_("Building the base week"), 0.9)
    base = _base(placed, panel, notes)
    costs = [None if np.isnan(cost) else float(cost) for cost in base.cost]
    items = tuple(replace(item, cost=cost) for item, cost in zip(placed.catalogue.items, costs, strict=True))
    catalogue = replace(placed.catalogue, items=with_known_clusters(items, placed.catalogue, notes))
    _last_checks(placed, base)
    notes += _said_about_history(placed, panel)
    used: Decimal = ledger.money.total(ledger.used)
    report = LoadReport(
        rows_read=len(ledger.raw),
        rows_used=int(ledger.used.sum()),
        money_read=ledger.money.total(),
        money_used=used,
        checks=ledger.checks(),
        matches=tuple(
            (name, ours, theirs)
            for name, table in judged.tables.items()
            for ours, theirs in table.names.items()
        ),
        events=listing_events(catalogue, panel),
        notes=tuple(notes),
    )
    progress.report(_("Loaded"), 1.0)
    return LoadedData(judged.request, catalogue, panel, base, report, ledger.rows_set_aside())
