"""From used rows to the market panel: cubes of store x week x item, then markets."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _
from planner.catalogue.items import Catalogue
from planner.sales.on_sale import OnSaleSettings, Shelf, infer_shelf, ranged_shelf, writes_zero_rows
from planner.sales.panel import MarketPanel
from planner.sales.prices import PriceSettings, fill_prices
from planner.sales.report import ListingEvent
from planner.sales.rows import Positions, SalesRows
from planner.sales.side_tables import Ranges
from planner.sales.weeks import monday_of

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]
Kind = TypeVar("Kind", bound=np.generic)


@dataclass(frozen=True)
class Cubes:
    """Sums over the used rows per store, week and item; all (S, W, J) unless said.

    start: the first week (see weeks.Days).  rows: number of rows.  open (S, W): the store has data.
    part (W,): part of the week that the file covers.  Optional columns are None, their cells NaN
    where the cell has no row with a value.
    """

    start: int
    rows: Floats
    units: Floats
    money: Floats
    open: Bools
    part: Floats
    price: Floats | None
    regular: Floats | None
    promotion: Floats | None
    display: Floats | None
    cost: Floats | None
    on_sale: Floats | None
    days_on_sale: Floats | None
    days_out_of_stock: Floats | None


def build_cubes(rows: SalesRows, store: Positions, item: Positions, n_stores: int, n_items: int) -> Cubes:
    """Add the rows up; store, item (n,) are positions on the catalogue's axes."""
    start = int(rows.week.min())
    week = rows.week - start
    n_weeks = int(week.max()) + 1
    shape = (n_stores, n_weeks, n_items)
    cell = (store.astype(np.int64) * n_weeks + week) * n_items + item

    def total(values: Floats | None) -> Floats:
        sums = np.bincount(cell, values, minlength=int(np.prod(shape)))
        return sums.reshape(shape).astype(np.float64)

    count = total(None)
    opened: Bools = np.any(count > 0, axis=2)

    def known_total(values: Floats | None) -> tuple[Floats, Floats] | None:
        if values is None:
            return None
        if not np.isnan(values.sum()):
            return total(values), count
        known = ~np.isnan(values)
        return total(np.where(known, values, 0.0)), total(known.astype(np.float64))

    def mean(values: Floats | None) -> Floats | None:
        sums = known_total(values)
        return None if sums is None else np.where(sums[1] > 0, sums[0] / np.maximum(sums[1], 1.0), np.nan)

    def summed(values: Floats | None) -> Floats | None:
        sums = known_total(values)
        return None if sums is None else np.where(sums[1] > 0, sums[0], np.nan)

    units = total(rows.units)
    # Netted returns leave rounding dust in weighed units.
    units = np.where(np.abs(units) < 1e-9, 0.0, np.maximum(units, 0.0))
    return Cubes(
        start, count, units, total(rows.money), opened, _covered(rows, week, n_weeks),
        mean(_positive(rows.price)), mean(_positive(rows.regular_price)), mean(rows.promotion),
        mean(rows.display), mean(rows.cost), mean(rows.on_sale), summed(rows.days_on_sale),
        summed(rows.days_out_of_stock),
    )  # fmt: skip


def _positive(values: Floats | None) -> Floats | None:
    """A price of 0 is no price."""
    return None if values is None else np.where(values > 0.0, values, np.nan)


def _covered(rows: SalesRows, week: Positions, n_weeks: int) -> Floats:
    """Part (W,) of each week with days in the file; only the first and the last can be cut."""
    part = np.ones(n_weeks)
    if rows.daily:
        for w in {0, n_weeks - 1}:
            days = np.unique(rows.day[week == w])
            monday = monday_of(int(rows.week.min()) + w).toordinal()
            # Days closed inside the week are the store's habit; days beyond the file's ends are missing.
            if w == 0 and days.size:
                part[w] -= (int(days.min()) - monday) / 7.0
            if w == n_weeks - 1 and days.size:
                part[w] -= (monday + 6 - int(days.max())) / 7.0
    return part


def find_shelf(cubes: Cubes, ranges: Ranges | None, settings: OnSaleSettings) -> tuple[Shelf, str]:
    """What was on the shelf, and the source in words."""
    seen = cubes.rows > 0
    flag_tells = cubes.on_sale is not None and bool(
        (seen & (np.nan_to_num(cubes.on_sale) < 0.5)).any() or (seen & (cubes.units <= 0.0)).any()
    )
    if flag_tells and cubes.on_sale is not None:
        seen = seen & ((np.nan_to_num(cubes.on_sale) >= 0.5) | (cubes.units > 0.0))
        listed, shelf = infer_shelf(cubes.units, seen, cubes.open, True, settings)
        if ranges is not None:
            own = ranges.named[:, None, :]
            listed = np.where(own, (ranges.in_range | seen) & cubes.open[:, :, None], listed)
            shelf = listed & seen
        nothing = np.zeros(seen.shape, dtype=bool)
        return Shelf(listed, shelf, nothing, nothing[:, 0]), _("On sale or not: the flag in the sales table.")
    if ranges is not None:
        found = ranged_shelf(ranges.in_range, ranges.named, cubes.units, seen, cubes.open, settings)
        return found, _("On sale or not: the ranges table.")
    complete = writes_zero_rows(cubes.units, seen, cubes.open)
    listed, shelf = infer_shelf(cubes.units, seen, cubes.open, complete, settings)
    nothing = np.zeros(seen.shape, dtype=bool)
    words = (
        _("On sale or not: weeks with a row, because the file also has rows for weeks without sales.")
        if complete
        else _(
            "On sale or not: inferred from first to last sale in each store; a gap longer than {n} weeks "
            "whose chance is below {p:g} at the item's own rate of sale counts as out of stock."
        ).format(n=settings.gap_weeks, p=settings.improbable)
    )
    return Shelf(listed, shelf, nothing, nothing[:, 0]), words


def bridge_successors(listed: Bools, opened: Bools, items: Ints, weeks: int) -> Bools:
    """Short gaps (at most ``weeks``) between an old code's range and its successor's stay listed."""
    result = listed.copy()
    for j in items:
        for s in range(listed.shape[0]):
            on = np.flatnonzero(listed[s, :, j])
            for a, b in pairwise(on):
                if 1 < b - a <= weeks + 1:
                    result[s, a:b, j] = opened[s, a:b]
    return result


def on_sale_part(cubes: Cubes, shelf: Shelf) -> Floats:
    """Part (S, W, J) of the week on the shelf, from days where a column tells."""
    part = shelf.on_shelf.astype(np.float64)
    if cubes.days_out_of_stock is not None:
        out = np.clip(np.nan_to_num(cubes.days_out_of_stock), 0.0, 7.0)
        part = part * (1.0 - out / 7.0)
    if cubes.days_on_sale is not None:
        days = np.clip(cubes.days_on_sale, 0.0, 7.0) / 7.0
        part = np.where(np.isnan(days), part, np.minimum(part, days))
    # What sold was on the shelf for a day at least.
    part = np.where((cubes.units > 0.0) & shelf.listed, np.maximum(part, 1.0 / 7.0), part)
    result: Floats = part * cubes.part[None, :, None]
    return result


def build_panel(
    catalogue: Catalogue,
    cubes: Cubes,
    shelf: Shelf,
    shoppers: Floats | None,
    net_money: bool,
    settings: PriceSettings,
) -> MarketPanel:
    """The panel; shoppers (S, W) or None.  Money net of VAT is brought back to consumer prices."""
    cluster = np.array(catalogue.cluster_of_store(), dtype=np.int64)
    vat = np.array([item.vat_rate for item in catalogue.items])
    gross = 1.0 + vat if net_money else np.ones(vat.size)
    sold = (cubes.units > 0.0) & (cubes.money > 0.0)
    paid = np.where(sold, cubes.money * gross / np.where(sold, cubes.units, 1.0), np.nan)
    shown = cubes.price if cubes.price is not None else np.full(paid.shape, np.nan)
    prices = fill_prices(paid, shown, cubes.regular, cubes.promotion, cluster, settings)
    given = np.array([item.price or 0.0 for item in catalogue.items])
    regular = np.where(np.isnan(prices.regular), given, prices.regular)
    price = np.where(np.isnan(prices.price), regular, prices.price)
    display = np.zeros(paid.shape) if cubes.display is None else np.nan_to_num(cubes.display)
    store, week = np.nonzero(cubes.open)

    def markets(cube: NDArray[Kind]) -> NDArray[Kind]:
        whole = store.size == cubes.open.size
        return cube.reshape(-1, cube.shape[2]) if whole else cube[store, week]

    return MarketPanel(
        weeks=tuple(monday_of(cubes.start + w) for w in range(cubes.open.shape[1])),
        store_index=store.astype(np.int64),
        week_index=week.astype(np.int64),
        units=markets(cubes.units),
        listed=markets(shelf.listed),
        on_sale=markets(on_sale_part(cubes, shelf)),
        regular_price=markets(regular),
        price=markets(price),
        promotion=markets(prices.promotion),
        display=markets((display > 0.5).astype(np.float64)),
        shoppers=None if shoppers is None else shoppers[store, week],
    )


def listing_events(catalogue: Catalogue, panel: MarketPanel) -> tuple[ListingEvent, ...]:
    """Items that came into or left a store's range between two of its weeks.

    The week of a listing is the first on the range, that of a delisting the first off it.
    """
    same_store = panel.store_index[1:] == panel.store_index[:-1]
    came = panel.listed[1:] & ~panel.listed[:-1] & same_store[:, None]
    left = ~panel.listed[1:] & panel.listed[:-1] & same_store[:, None]
    found = [(t + 1, j, "listed") for t, j in zip(*np.nonzero(came), strict=True)]
    found += [(t + 1, j, "delisted") for t, j in zip(*np.nonzero(left), strict=True)]
    found.sort(key=lambda event: (panel.week_index[event[0]], event[0], event[1]))
    return tuple(
        ListingEvent(
            catalogue.stores[panel.store_index[t]].code,
            catalogue.items[j].code,
            panel.weeks[panel.week_index[t]],
            kind,
        )
        for t, j, kind in found
    )
