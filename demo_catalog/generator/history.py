"""Seventy-eight weeks of shopping, one need at a time."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from demo_catalog.generator.lists import CLUSTERS, SEGMENTS, ItemFacts
from demo_catalog.generator.market import TrueMarket
from demo_catalog.generator.prices import ItemMoney
from demo_catalog.generator.settings import DemoSettings
from demo_catalog.generator.shelves import Move, Stores, first_ranges, refit, review, single_moves
from demo_catalog.generator.succession import Succession
from demo_catalog.generator.tastes import MOODS, Households

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

_CLEARANCE_WEEKS = 3
_CLEARANCE_DEPTH = 0.30
# Half the swing between summer and winter in liking, by segment.
_SEASON_SWING = np.array([0.05, -0.12, 0.05, 0.30, -0.10, 0.0, 0.22])


@dataclass(frozen=True)
class History:
    """What happened.  W weeks, S stores, J items.

    listed (W, S, J).  units (W, S, J).  days_out (W, S, J): days out of stock.
    depth (W, S, J): price cut in force, 0 without promotion.  visitors (W, S).
    season (W,): level of the needs.  season_liking (W, G).
    """

    listed: Bools
    units: Ints
    days_out: NDArray[np.int8]
    depth: Floats
    visitors: Ints
    season: Floats
    season_liking: Floats


def season_of(settings: DemoSettings) -> tuple[Floats, Floats]:
    """Level of the needs (W,) and liking by segment (W, G): both highest in the middle of January."""
    day = np.array([settings.monday(w).timetuple().tm_yday for w in range(settings.weeks)])
    winter = np.cos(2.0 * np.pi * (day - 15) / 365.25)
    return 1.0 + 0.2 * winter, winter[:, None] * _SEASON_SWING[None, : len(SEGMENTS)]


def ordinary_market(
    codes: tuple[str, ...],
    items: tuple[ItemFacts, ...],
    stores: Stores,
    money: ItemMoney,
    people: Households,
    today: Bools,
    weeks: slice,
    settings: DemoSettings,
) -> TrueMarket:
    """The shoppers' expected week: prices of the last of ``weeks``, mean season and liking of them all."""
    season, season_liking = season_of(settings)
    segment = np.array([item.segment for item in items])
    price = money.regular[weeks][-1]
    shift = season_liking[weeks].mean(axis=0)[segment] + money.drift[weeks].mean(axis=0)
    row_store = np.repeat(people.store, MOODS)
    worth = people.liking + shift[people.item]
    worth -= people.price_weight[:, None] * np.log(price)[stores.cluster[row_store][:, None], people.item]
    worth[(people.item < 0) | (worth < people.least[:, None])] = -np.inf
    rank = np.argsort(-worth, axis=1, kind="stable")
    item = np.take_along_axis(people.item, rank, axis=1)
    accepted = np.isfinite(np.take_along_axis(worth, rank, axis=1))
    needs = (people.rate[:, None] * people.weight).ravel() * season[weeks].mean()
    return TrueMarket(
        items=codes,
        stores=stores.code,
        clusters=CLUSTERS,
        cluster=stores.cluster,
        today=today,
        price=price,
        cost=money.cost[weeks][-1],
        vat=money.vat,
        space_cm=money.space_cm,
        space_limit=stores.space_cm,
        is_offer=np.array([item.launch == 3 for item in items]),
        order=np.where(accepted, item, len(items)),
        needs=needs,
        store=row_store,
    )


@dataclass(frozen=True)
class _Offered:
    """One week as shoppers find it.  price, depth, days_out, spare (S, J); liking (J,); level (S,).

    spare: chance that a pack lasts for one more need; level: how many have a need.
    """

    price: Floats
    depth: Floats
    days_out: NDArray[np.int8]
    spare: Floats
    liking: Floats
    level: Floats


@dataclass
class _Week:
    """The state that runs along."""

    present: Bools
    since: Ints
    out_days: Ints
    pantry: Ints


def play(
    items: tuple[ItemFacts, ...],
    stores: Stores,
    money: ItemMoney,
    people: Households,
    succession: Succession,
    settings: DemoSettings,
    rng: np.random.Generator,
) -> History:
    """Week by week: ranges move, shelves run out, shoppers choose; reviews look at what sold."""
    n_weeks, n_stores, n_items = settings.weeks, len(stores.code), len(items)
    state = _Week(
        _opening(items, stores, money, people, settings, rng),
        np.full((n_stores, n_items), -999),
        np.zeros((n_stores, n_items), dtype=np.int64),
        np.zeros(people.store.size, dtype=np.int64),
    )
    moves = single_moves(stores, sum(item.launch == 0 for item in items), settings, rng)
    season, season_liking = season_of(settings)
    listed = np.zeros((n_weeks, n_stores, n_items), dtype=bool)
    units = np.zeros((n_weeks, n_stores, n_items), dtype=np.int64)
    days_out = np.zeros((n_weeks, n_stores, n_items), dtype=np.int8)
    depth = np.zeros((n_weeks, n_stores, n_items))
    visitors = np.zeros((n_weeks, n_stores), dtype=np.int64)
    usual = np.bincount(people.store) * rng.uniform(2.6, 4.2, n_stores)
    for week in range(n_weeks):
        for number, start in enumerate(settings.review_weeks, start=1):
            if week == start - _CLEARANCE_WEEKS - 1:
                rate = recent_rate(units[:week], listed[:week], stores.cluster)
                moves += review(
                    number, items, stores, money.space_cm, money.keep, state.present, rate, settings, rng
                )
        for s in np.flatnonzero(stores.refit_week == week):
            rate = recent_rate(units[:week], listed[:week], stores.cluster)
            moves += refit(int(s), stores, money.space_cm, money.keep, state.present, rate, week)
        _take_moves(state, moves, week, stores, money)
        listed[week] = state.present
        depth[week] = np.where(state.present, money.depth[week], 0.0)
        leaving = _leaving(moves, week, depth[week], state.present)
        days_out[week] = _run_out(state, depth[week] > 0, leaving, settings, rng)
        mood = rng.lognormal(0.0, 0.05, n_stores) * rng.lognormal(0.0, 0.03)
        visitors[week] = np.rint(usual * mood * rng.lognormal(0.0, 0.02, n_stores))
        liking = season_liking[week][np.array([item.segment for item in items])] + money.drift[week]
        price = np.round(money.regular[week][stores.cluster] * (1.0 - depth[week]), 2)
        spare = succession.spare(items, week)
        found = _Offered(price, depth[week], days_out[week], spare, liking, season[week] * mood)
        units[week] = _shop(state, week, people, found, rng)
    return History(listed, units, days_out, depth, visitors, season, season_liking)


def _opening(
    items: tuple[ItemFacts, ...],
    stores: Stores,
    money: ItemMoney,
    people: Households,
    settings: DemoSettings,
    rng: np.random.Generator,
) -> Bools:
    """Ranges before the first week, after what shoppers would take if everything stood there."""
    open_to = np.array([item.launch == 0 for item in items])
    everything = np.tile(open_to, (len(stores.code), 1))
    codes = tuple(item.code for item in items)
    market = ordinary_market(codes, items, stores, money, people, everything, slice(0, 1), settings)
    sold = market.units(everything)
    appeal = np.stack([sold[stores.cluster == c].sum(axis=0) for c in range(len(CLUSTERS))])
    return first_ranges(items, stores, money.space_cm, appeal / appeal.mean(), rng)


def recent_rate(units: Ints, listed: Bools, cluster: Ints) -> Floats:
    """Units per store and week on the shelf over the last 12 weeks, (C, J); NaN where not carried."""
    sold, shelf = units[-12:].sum(axis=0), listed[-12:].sum(axis=0)
    rate = np.full((len(CLUSTERS), units.shape[2]), np.nan)
    for c in range(len(CLUSTERS)):
        weeks = shelf[cluster == c].sum(axis=0)
        np.divide(sold[cluster == c].sum(axis=0), weeks, out=rate[c], where=weeks > 0)
    return rate


def _take_moves(state: _Week, moves: list[Move], week: int, stores: Stores, money: ItemMoney) -> None:
    """Moves of this week; a store takes nothing in that does not fit."""
    for move in sorted((m for m in moves if m.week == week), key=lambda m: m.listed):
        row = state.present[move.store]
        if move.listed == row[move.item] or (not move.listed and money.keep[move.item]):
            continue
        filled = money.space_cm[row].sum() + money.space_cm[move.item]
        if move.listed and filled > stores.space_in(week)[move.store]:
            continue
        row[move.item] = move.listed
        state.since[move.store, move.item] = week


def _leaving(moves: list[Move], week: int, depth: Floats, present: Bools) -> Bools:
    """Cells about to be cleared (S, J); their price is cut where no promotion cuts it deeper."""
    leaving = np.zeros(present.shape, dtype=bool)
    for move in moves:
        if move.cleared and 0 < move.week - week <= _CLEARANCE_WEEKS and present[move.store, move.item]:
            leaving[move.store, move.item] = True
            # Not every item is marked down; the choice is the item's, so that stores agree.
            if move.item % 3:
                depth[move.store, move.item] = max(depth[move.store, move.item], _CLEARANCE_DEPTH)
    return leaving


def _run_out(
    state: _Week, promoted: Bools, leaving: Bools, settings: DemoSettings, rng: np.random.Generator
) -> NDArray[np.int8]:
    """Days out of stock this week (S, J); what is left runs on into the next week."""
    chance = settings.stock_out * np.where(promoted, 2.2, 1.0) + 0.22 * leaving
    starts = (state.out_days == 0) & (rng.random(promoted.shape) < chance)
    length = 1 + rng.geometric(0.35, promoted.shape)
    state.out_days = np.where(starts, length, state.out_days)
    state.out_days[~state.present] = 0
    today = np.minimum(state.out_days, 7)
    state.out_days = state.out_days - today
    return today.astype(np.int8)


def _shop(state: _Week, week: int, people: Households, found: _Offered, rng: np.random.Generator) -> Ints:
    """Units sold this week (S, J): every household with a need takes the best it finds, or goes."""
    in_need = np.flatnonzero(rng.random(people.store.size) < people.rate * found.level[people.store])
    served = state.pantry[in_need] > 0
    state.pantry[in_need[served]] -= 1
    who = in_need[~served]
    draw = rng.random(who.size)
    split = np.cumsum(people.weight[who], axis=1)
    row = who * MOODS + (draw > split[:, 0]) + (draw > split[:, 1])
    item, store = people.item[row], people.store[who][:, None]
    there = state.present[store, item] & (item >= 0)
    there &= rng.integers(0, 7, who.size)[:, None] >= found.days_out[store, item]
    there &= week - state.since[store, item] >= people.aware[row]
    cut = found.depth[store, item]
    worth = people.liking[row] + found.liking[item] + 0.25 * (cut > 0)
    worth -= people.price_weight[row][:, None] * np.log(found.price)[store, item]
    worth[~there] = -np.inf
    best = worth.argmax(axis=1)
    spot = np.arange(who.size)
    takes = worth[spot, best] >= people.least[row]
    double = takes & people.stores_up[who] & (cut[spot, best] >= 0.2)
    state.pantry[who[double]] += 1
    # A bigger old pack lasts longer: some of its buyers skip their next need.
    longer = takes & (rng.random(who.size) < found.spare[people.store[who], item[spot, best]])
    state.pantry[who[longer]] += 1
    shape = found.price.shape
    cell = people.store[who] * shape[1] + item[spot, best]
    sold = np.bincount(cell[takes], weights=(1 + double)[takes], minlength=shape[0] * shape[1])
    return np.rint(sold).astype(np.int64).reshape(shape)
