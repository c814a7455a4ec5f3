"""The bench: every item by segment, today and in the plan, and what its delisting would do."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from planner.base.text import _
from planner.plan.limits import ItemLock
from planner.plan.plans import States
from planner.tables.build import flag, money, number, percent, text
from planner.tables.effects import Bools, Floats
from planner.tables.names import lock_words, plan_word
from planner.tables.plan import cluster_of, states_of_today
from planner.tables.receivers import cluster_positions
from planner.tables.table import Column, Table
from planner.transfer.what_if import OUT

if TYPE_CHECKING:
    from planner.demand.fitted import FittedModel
    from planner.sales.panel import BaseWeek, MarketPanel
    from planner.sales.report import LoadedData
    from planner.transfer.delistings import DelistingTransfers


def rate_of_sale(panel: MarketPanel, base: BaseWeek, stores: Bools, promoted: bool) -> Floats:
    """Units (J,) per store per week on sale in the baseline window, in promoted or ordinary weeks; else NaN.

    stores (S,): which ones count.
    """
    window = (panel.week_index >= len(panel.weeks) - base.weeks) & stores[panel.store_index]
    shelf, sold = panel.on_sale[window], panel.units[window]
    wanted = (panel.promotion[window] > 0.5) == promoted
    weeks = (shelf * wanted).sum(axis=0)
    units = (sold * wanted * (shelf > 0.0)).sum(axis=0)
    rate: Floats = np.where(weeks > 0.0, units / np.where(weeks > 0.0, weeks, 1.0), np.nan)
    return rate


def mean_over_clusters(values: Floats, units: Floats) -> Floats:
    """(J,) mean of (C, J) weighted by units; plain where nothing sells."""
    weight = np.where(units.sum(axis=0) > 0.0, units, 1.0)
    counted = np.where(weight > 0.0, values, 0.0)
    mean: Floats = (counted * weight).sum(axis=0) / weight.sum(axis=0)
    return mean


def _order(loaded: LoadedData, sales: Floats) -> list[int]:
    """Items by segment, the largest sales first, offers last inside their segment."""
    items = loaded.catalogue.items

    def rank(j: int) -> tuple[str, bool, float, str]:
        return items[j].segment, items[j].is_offer, -float(sales[j]), items[j].code

    return sorted(range(len(items)), key=rank)


def bench_table(
    loaded: LoadedData,
    fitted: FittedModel | None,
    delistings: DelistingTransfers | None,
    states: States,
    locks: tuple[ItemLock, ...] = (),
    cluster: str | None = None,
) -> Table:
    """One row per item; ``cluster``: today, plan, price, rate and units of this one only.

    in_plan: True on every list, False on none, None in between.  stays and margin_lost speak of
    a delisting in all stores, one item at a time; empty before a fit, for items not sold today, and
    (margin) where the item's cost is unknown.  Raises CallError for an unknown cluster.
    """
    catalogue, base, now = loaded.catalogue, loaded.base, states_of_today(loaded)
    where = cluster_positions(catalogue.clusters, cluster)
    of_store = cluster_of(loaded)
    stores = np.isin(of_store, where)
    units = np.stack([base.units[of_store == c].sum(axis=0) for c in where])
    price, margin = (mean_over_clusters(v[where], units) for v in (base.price, base.margin))
    ordinary, promoted = (rate_of_sale(loaded.panel, base, stores, kind) for kind in (False, True))
    order = _order(loaded, units.sum(axis=0) * np.nan_to_num(price))
    items = [catalogue.items[j] for j in order]
    present = states[where] != OUT
    in_plan = [True if present[:, j].all() else None if present[:, j].any() else False for j in order]
    columns = (
        text("segment", _("Segment"), [item.segment for item in items]),
        text("item", _("Item"), [item.code for item in items]),
        text("description", _("Description"), [item.description for item in items]),
        text("brand", _("Brand"), [item.brand for item in items]),
        text("supplier", _("Supplier"), [item.supplier for item in items]),
        flag("own_label", _("Own label"), [item.own_label for item in items]),
        flag("offer", _("Offer"), [item.is_offer for item in items]),
        percent("today", _("Stores today"), base.today[stores].mean(axis=0)[order]),
        flag("in_plan", _("In the plan"), in_plan),
        text("plan", _("Plan"), [plan_word(states[where, j], now[where, j]) for j in order]),
        flag("changed", _("Changed"), [(states[where, j] != now[where, j]).any() for j in order]),
        text("lock", _("Lock"), [lock_words(locks, item.code, cluster) for item in items]),
        money("price", _("Price"), price[order]),
        money("margin", _("Margin per unit"), margin[order]),
        number("rate_of_sale", _("Rate of sale"), ordinary[order]),
        number("rate_on_promotion", _("On promotion"), promoted[order]),
        number("units", _("Units a week"), units.sum(axis=0)[order]),
        number("space", _("Space"), base.space_cm[order], 1, _("cm") if base.space_known else _("places")),
        *_after_delisting(loaded, delistings, order),
    )
    notes = [_("Rate of sale: units per store per week on sale; last {n} weeks.").format(n=base.weeks)]
    if fitted is None or delistings is None:
        notes.append(_("Fit the share model to see what stays in the category and what a delisting costs."))
    else:
        notes.append(_("Stays, margin lost: if the item alone left all stores; low and high: 80 % interval."))
    return Table("bench", _("Bench"), columns, tuple(notes))


def _after_delisting(
    loaded: LoadedData, delistings: DelistingTransfers | None, order: list[int]
) -> tuple[Column, ...]:
    blank: Floats = np.full(len(order), np.nan)
    stays, stays_low, stays_high = blank, blank, blank
    lost, low, high = blank, blank, blank
    if delistings is not None:
        stays, stays_low, stays_high = delistings.stays, delistings.stays_low, delistings.stays_high
        # Without its own cost an item's delisting would look like a pure gain.
        known = np.where(np.isnan(loaded.base.margin).any(axis=0), np.nan, 0.0)
        lost = known - delistings.margin_change
        low, high = known - delistings.margin_high, known - delistings.margin_low
    return (
        percent("stays", _("Stays in the category if delisted"), stays[order]),
        percent("stays_low", _("Stays, low"), stays_low[order]),
        percent("stays_high", _("Stays, high"), stays_high[order]),
        money("margin_lost", _("Margin lost a week if delisted"), lost[order]),
        money("margin_lost_low", _("Margin lost, low"), low[order]),
        money("margin_lost_high", _("Margin lost, high"), high[order]),
    )
