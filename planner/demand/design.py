"""From the market panel to the arrays of the likelihood: covariates, season, blocks."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.catalogue.items import Catalogue
from planner.demand.likelihood import CATEGORY_SHOPPERS, CATEGORY_VOLUME, Layout, MarketBlock
from planner.demand.settings import NestedSettings
from planner.sales.panel import BaseWeek, MarketPanel, dense

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

WEEKS_PER_YEAR = 365.25 / 7.0
FAR = 10_000


@dataclass(frozen=True)
class Design:
    """Blocks by cluster, the layout, and what the covariates are called.

    names (K): covariate names; groups (K): their parameter group.
    rows: markets (positions in the panel) of every block.
    season_now (M,): season terms averaged over the baseline window.
    price_column: position of ln regular price among the covariates, -1 when it never moves.
    """

    blocks: tuple[MarketBlock, ...]
    layout: Layout
    segment: Ints
    names: tuple[str, ...]
    groups: tuple[str, ...]
    rows: tuple[Ints, ...]
    season_now: Floats
    price_column: int


def weeks_since_listing(panel: MarketPanel, n_stores: int) -> Ints:
    """Weeks (T, J) since the item came into the store's range; FAR when it was there from the start."""
    listed = dense(panel, panel.listed, n_stores, np.nan)
    age = np.full(listed.shape, FAR, dtype=np.int64)
    for w in range(1, listed.shape[1]):
        arrived = (listed[:, w] == 1.0) & (listed[:, w - 1] == 0.0)
        age[:, w] = np.where(arrived, 0, np.minimum(age[:, w - 1] + 1, FAR))
    result: Ints = age[panel.store_index, panel.week_index]
    return result


def weeks_to_delisting(panel: MarketPanel, n_stores: int) -> Ints:
    """Weeks (T, J) until the item leaves the store's range (0: last week); FAR when it stays."""
    listed = dense(panel, panel.listed, n_stores, np.nan)
    ahead = np.full(listed.shape, FAR, dtype=np.int64)
    for w in range(listed.shape[1] - 2, -1, -1):
        leaving = (listed[:, w] == 1.0) & (listed[:, w + 1] == 0.0)
        ahead[:, w] = np.where(leaving, 0, np.minimum(ahead[:, w + 1] + 1, FAR))
    result: Ints = ahead[panel.store_index, panel.week_index]
    return result


def _bins(weeks: Ints, listed: Bools, last: tuple[int, ...]) -> list[Floats]:
    """One 0/1 column per bin of ``weeks``."""
    columns, first = [], 0
    for end in last:
        columns.append(((weeks >= first) & (weeks <= end) & listed).astype(np.float64))
        first = end + 1
    return columns


def _discount_memory(panel: MarketPanel, depth: Floats, n_stores: int, weeks: int) -> Floats:
    """Mean discount depth (T, J) of the item in the ``weeks`` weeks before."""
    cube = np.nan_to_num(dense(panel, depth, n_stores, 0.0))
    running = np.cumsum(cube, axis=1)
    memory = np.zeros_like(cube)
    for w in range(1, cube.shape[1]):
        first = max(0, w - weeks)
        before = running[:, first - 1] if first > 0 else 0.0
        memory[:, w] = (running[:, w - 1] - before) / weeks
    result: Floats = memory[panel.store_index, panel.week_index]
    return result


@dataclass(frozen=True)
class Discounts:
    """depth, memory (T, J): ln regular over paid price now, and its mean over the weeks before.

    level (T, G, 2), category (T, 2): both weighted by what the items sell in the cluster, over
    the segment and over the category.  Promotions make shoppers stock up; without terms of
    their own these bulges and dips would pass for the answer to what is on the shelf.
    """

    depth: Floats
    memory: Floats
    level: Floats
    category: Floats


def _discounts(panel: MarketPanel, cluster: Ints, segment: Ints, n_segments: int, weeks: int) -> Discounts:
    """All discount terms of the panel."""
    with np.errstate(divide="ignore", invalid="ignore"):
        depth = np.maximum(np.log(panel.regular_price / panel.price), 0.0)
    depth = np.where(np.isfinite(depth) & panel.listed, depth, 0.0)
    memory = _discount_memory(panel, depth, cluster.size, weeks)
    of_market = cluster[panel.store_index]
    weight = np.zeros_like(depth)
    for c in np.unique(of_market):
        weight[of_market == c] = panel.units[of_market == c].sum(axis=0)
    weight = np.where(panel.listed, weight, 0.0)
    members = (segment[:, None] == np.arange(n_segments)).astype(np.float64)
    by_segment = np.maximum(weight @ members, 1e-9)
    in_all = np.maximum(weight.sum(axis=1), 1e-9)
    parts = [weight * values for values in (depth, memory)]
    return Discounts(
        depth,
        memory,
        np.stack([part @ members / by_segment for part in parts], axis=2),
        np.stack([part.sum(axis=1) / in_all for part in parts], axis=1),
    )


def _covariates(
    panel: MarketPanel,
    base: BaseWeek,
    cluster: Ints,
    discounts: Discounts,
    settings: NestedSettings,
) -> tuple[Floats, list[str], list[str]]:
    """Covariates (T, J, K) that are all zero in the base week, with names and groups."""
    n_stores = cluster.size
    reference = base.price[cluster[panel.store_index]]
    with np.errstate(divide="ignore", invalid="ignore"):
        price = np.log(panel.regular_price / reference)
    price = np.where(np.isfinite(price), price, 0.0)
    columns = [
        ("regular price, ln", "price", price),
        ("discount depth, ln", "price", discounts.depth),
        ("promotion", "promotion", panel.promotion),
        ("display", "promotion", panel.display),
        ("discount depth, last weeks", "price", discounts.memory),
    ]
    since = weeks_since_listing(panel, n_stores)
    ahead = weeks_to_delisting(panel, n_stores)
    for end, column in zip(settings.ramp_up, _bins(since, panel.listed, settings.ramp_up), strict=True):
        columns.append((f"up to week {end + 1} after listing", "ramp-up", column))
    for end, column in zip(settings.clearance, _bins(ahead, panel.listed, settings.clearance), strict=True):
        columns.append((f"up to week {end + 1} before delisting", "clearance", column))
    shelf = panel.on_sale > 0.0
    used = [entry for entry in columns if shelf.any() and np.ptp(entry[2][shelf]) > 1e-9]
    stacked = (
        np.stack([np.where(shelf, c, 0.0) for _n, _g, c in used], axis=2)
        if used
        else np.zeros((*shelf.shape, 0))
    )
    return stacked, [name for name, _g, _c in used], [group for _n, group, _c in used]


def _season(panel: MarketPanel, harmonics: int) -> Floats:
    """Sine and cosine pairs of the year, (W, 2 x harmonics)."""
    year = np.array([week.timetuple().tm_yday for week in panel.weeks]) / 7.0 / WEEKS_PER_YEAR
    angles = 2.0 * np.pi * np.outer(year, np.arange(1, harmonics + 1))
    return np.concatenate([np.sin(angles), np.cos(angles)], axis=1)


def build_design(
    panel: MarketPanel, catalogue: Catalogue, base: BaseWeek, settings: NestedSettings, with_shoppers: bool
) -> Design:
    """All arrays of the likelihood, one block per cluster.

    The regular price enters relative to the base week's, so that an item effect is the scaled
    utility at today's price; ramp-up, clearance and promotions are zero in the base week.
    """
    cluster = np.array(catalogue.cluster_of_store(), dtype=np.int64)
    segment = np.array(catalogue.segment_of_item(), dtype=np.int64)
    discounts = _discounts(panel, cluster, segment, len(catalogue.segments), settings.discount_memory)
    covariates, names, groups = _covariates(panel, base, cluster, discounts, settings)
    # One year at most can be told from week effects; short histories get no season by segment.
    harmonics = settings.season_harmonics if len(panel.weeks) >= 40 else 0
    season = _season(panel, harmonics)
    # Something sold was on the shelf for a part of the week at least.
    part = np.where(panel.units > 0.0, np.maximum(panel.on_sale, 1.0 / 7.0), panel.on_sale)
    with np.errstate(divide="ignore"):
        log_part = np.log(part)
    shoppers = panel.shoppers if with_shoppers and panel.shoppers is not None else np.zeros(panel.n_markets)
    blocks, rows = [], []
    for c in range(len(catalogue.clusters)):
        own = np.flatnonzero(cluster[panel.store_index] == c)
        rows.append(own)
        blocks.append(
            MarketBlock(
                counts=panel.units[own],
                log_part=log_part[own],
                covariates=covariates[own],
                season=season[panel.week_index[own]],
                level=discounts.level[own],
                category=discounts.category[own],
                store=panel.store_index[own],
                week=panel.week_index[own],
                shoppers=shoppers[own],
            )
        )
    layout = Layout(
        n_clusters=len(catalogue.clusters),
        n_items=panel.n_items,
        n_covariates=len(names),
        n_segments=len(catalogue.segments),
        n_season=season.shape[1],
        n_stores=len(catalogue.stores),
        n_weeks=len(panel.weeks),
        category=CATEGORY_SHOPPERS if with_shoppers else CATEGORY_VOLUME,
        n_level=discounts.level.shape[2],
        n_category=discounts.category.shape[1],
    )
    window = season[-base.weeks :]
    price_column = names.index("regular price, ln") if "regular price, ln" in names else -1
    return Design(
        tuple(blocks),
        layout,
        segment,
        tuple(names),
        tuple(groups),
        tuple(rows),
        window.mean(axis=0) if len(window) else np.zeros(season.shape[1]),
        price_column,
    )
