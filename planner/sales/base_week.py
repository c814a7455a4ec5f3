"""One ordinary week today: what is listed, sold, charged and paid for, and the space it takes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _
from planner.catalogue.items import Catalogue
from planner.sales.panel import BaseWeek, MarketPanel
from planner.sales.runs import upper_median

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]

NAMED = 8


@dataclass(frozen=True)
class WeekInputs:
    """today (S, J): listed now, or None when the last week tells.  cost, margin_rate (J,): NaN where
    unknown; a cost outranks a rate (of the price net of VAT).  part (W,): part of each week that
    the file covers.
    """

    today: Bools | None
    cost: Floats
    margin_rate: Floats
    part: Floats


def build_base(catalogue: Catalogue, panel: MarketPanel, inputs: WeekInputs, baseline_weeks: int) -> BaseWeek:
    """The base week from the last ``baseline_weeks`` weeks of the panel."""
    n_weeks, n_stores = len(panel.weeks), len(catalogue.stores)
    weeks = min(max(baseline_weeks, 1), n_weeks)
    first = n_weeks - weeks
    window = panel.week_index >= first
    store, part = panel.store_index[window], inputs.part[panel.week_index[window]]
    covered = np.maximum(np.bincount(store, part, minlength=n_stores), 1e-9)
    units = np.zeros((n_stores, panel.n_items))
    np.add.at(units, store, panel.units[window])
    last_market = np.zeros(n_stores, dtype=np.int64)
    last_market[panel.store_index] = np.arange(panel.n_markets)
    today = panel.listed[last_market] if inputs.today is None else inputs.today
    notes: list[str] = []
    price = _regular_now(catalogue, panel, last_market, today)
    vat = np.array([item.vat_rate for item in catalogue.items])
    if not vat.any():
        notes.append(_("No VAT rates: prices and sales are taken as net of VAT."))
    net_price = price / (1.0 + vat)
    by_rate = net_price.mean(axis=0) * (1.0 - inputs.margin_rate)
    cost = np.where(np.isnan(inputs.cost), by_rate, inputs.cost)
    space, known = _space(catalogue, today, notes)
    _say_costs(catalogue, cost, today, units, notes)
    shoppers = None
    if panel.shoppers is not None:
        shoppers = np.bincount(store, panel.shoppers[window], minlength=n_stores) / covered
    return BaseWeek(
        today=today,
        units=units / covered[:, None],
        weeks=weeks,
        first_week=panel.weeks[first],
        price=price,
        cost=cost,
        margin=net_price - cost,
        net_price=net_price,
        shoppers=shoppers,
        space_cm=space,
        space_limit=_limits(catalogue, space, today, known, notes),
        space_known=known,
        notes=tuple(notes),
    )


def _regular_now(catalogue: Catalogue, panel: MarketPanel, last_market: Ints, today: Bools) -> Floats:
    """Regular price (C, J) in the last week: the cluster's stores that list the item, else all of them."""
    cluster = np.array(catalogue.cluster_of_store(), dtype=np.int64)
    cells = panel.regular_price[last_market]
    cells = np.where(cells > 0.0, cells, np.nan)
    listed = np.where(today, cells, np.nan)
    n = len(catalogue.clusters)
    own = np.stack([upper_median(listed[cluster == c]) for c in range(n)])
    every = np.stack([upper_median(cells[cluster == c]) for c in range(n)])
    price = np.where(np.isnan(own), every, own)
    price = np.where(np.isnan(price), upper_median(price)[None], price)
    given = np.array([item.price or np.nan for item in catalogue.items])
    offer = np.array([item.is_offer for item in catalogue.items])
    price = np.where((offer & ~np.isnan(given))[None], given[None], price)
    result: Floats = np.where(np.isnan(price), np.nan_to_num(given)[None], price)
    return result


def _names(codes: list[str]) -> str:
    shown = ", ".join(codes[:NAMED])
    return (
        shown if len(codes) <= NAMED else _("{shown} and {n} more").format(shown=shown, n=len(codes) - NAMED)
    )


def _space(catalogue: Catalogue, today: Bools, notes: list[str]) -> tuple[Floats, bool]:
    """Space (J,) per item in cm; one each when no item's space is known."""
    space = np.array([item.space_cm for item in catalogue.items])
    known = space > 0.0
    if not known.any():
        notes.append(_("No item's space is known: the limit is today's number of items in each store."))
        return np.ones(space.size), False
    if not known.all():
        segment = np.array(catalogue.segment_of_item())
        everywhere = float(np.median(space[known]))
        for j in np.flatnonzero(~known):
            alike = space[known & (segment == segment[j])]
            space[j] = float(np.median(alike)) if alike.size else everywhere
        missing = [item.code for item, has in zip(catalogue.items, known, strict=True) if not has]
        notes.append(
            _("Space is missing for {n} items and taken as their segment's median: {names}.").format(
                n=len(missing), names=_names(missing)
            )
        )
    return space, True


def _limits(catalogue: Catalogue, space: Floats, today: Bools, known: bool, notes: list[str]) -> Floats:
    """Space (S,) of every store: as given, at least today's use."""
    use = today.astype(np.float64) @ space
    if not known:
        return use
    given = np.array([np.nan if s.space_cm is None else s.space_cm for s in catalogue.stores])
    codes = [store.code for store in catalogue.stores]
    without = [code for code, room in zip(codes, given, strict=True) if np.isnan(room)]
    if without:
        notes.append(
            _("Space is missing for {n} stores; today's use is their limit: {names}.").format(
                n=len(without), names=_names(without)
            )
        )
    tight = [code for code, room, used in zip(codes, given, use, strict=True) if room < used - 1e-6]
    if tight:
        notes.append(
            _("Today's items need more than the given space in {n} stores, raised to that: {names}.").format(
                n=len(tight), names=_names(tight)
            )
        )
    result: Floats = np.fmax(given, use)
    return result


def _say_costs(catalogue: Catalogue, cost: Floats, today: Bools, units: Floats, notes: list[str]) -> None:
    """Name the items whose cost is unknown."""
    matters = today.any(axis=0) | (units.sum(axis=0) > 0.0)
    missing = np.isnan(cost) & matters
    if np.isnan(cost).all():
        notes.append(_("No costs: margin is unknown and sales take its place. Add costs to see margin."))
    elif missing.any():
        codes = [catalogue.items[j].code for j in np.flatnonzero(missing)]
        share = float(units[:, missing].sum() / max(units.sum(), 1e-9))
        notes.append(
            _("Cost is missing for {n} items ({share:.1%} of units): {names}.").format(
                n=len(codes), share=share, names=_names(codes)
            )
        )
