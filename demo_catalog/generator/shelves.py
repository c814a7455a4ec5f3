"""Stores, their ranges at the start, and what the two range reviews change."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from demo_catalog.generator.lists import BRANDS, CLUSTERS, SIZES, TOWNS, ItemFacts
from demo_catalog.generator.settings import DemoSettings

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

# Metres of shelf come in bays of 125 cm.
_BAYS = (5, 7, 9)
BAY_CM = 125.0


@dataclass(frozen=True)
class Stores:
    """S stores.  code, town (S); cluster, size (S,): positions; space_cm (S,): today's shelf.

    first_space_cm (S,): shelf before a refit; refit_week (S,): when it changed, -1: never.
    """

    code: tuple[str, ...]
    town: tuple[str, ...]
    cluster: Ints
    size: Ints
    space_cm: Floats
    first_space_cm: Floats
    refit_week: Ints

    def space_in(self, week: int) -> Floats:
        """Shelf of every store in a week, (S,)."""
        return np.where(week < self.refit_week, self.first_space_cm, self.space_cm)


@dataclass(frozen=True)
class Move:
    """One store takes an item in or out from a week on.  cleared: sold off before it goes."""

    week: int
    store: int
    item: int
    listed: bool
    cleared: bool = False


def draw_stores(settings: DemoSettings, rng: np.random.Generator) -> Stores:
    """Twelve stores a cluster: five small, four medium, three large; some refitted by one bay."""
    count = len(TOWNS)
    cluster = rng.permutation(np.repeat(np.arange(len(CLUSTERS)), count // len(CLUSTERS)))
    size = np.empty(count, dtype=np.int64)
    for c in range(len(CLUSTERS)):
        size[cluster == c] = rng.permutation(np.repeat(np.arange(len(SIZES)), (5, 4, 3)))
    numbers = np.sort(rng.choice(np.arange(3, 160), size=count, replace=False))
    extra = (rng.random(count) < 0.25) * 0.5
    space = (np.array(_BAYS)[size] + extra) * BAY_CM
    refit = np.full(count, -1)
    bays = np.zeros(count)
    chosen = rng.choice(count, size=settings.refits, replace=False)
    refit[chosen] = rng.integers(8, settings.weeks - 10, chosen.size)
    bays[chosen] = rng.choice(np.array([-1.0, 1.0]), chosen.size)
    return Stores(
        code=tuple(f"{number:03d}" for number in numbers),
        town=TOWNS,
        cluster=cluster,
        size=size,
        space_cm=space,
        first_space_cm=space - bays * BAY_CM,
        refit_week=refit,
    )


def first_ranges(
    items: tuple[ItemFacts, ...],
    stores: Stores,
    space: Floats,
    appeal: Floats,
    rng: np.random.Generator,
) -> Bools:
    """Ranges before the history (S, J): by cluster and size, after ``appeal`` (C, J), not quite by it."""
    segment = np.array([item.segment for item in items])
    open_to = np.array([item.launch == 0 for item in items])
    present = np.zeros((len(stores.code), len(items)), dtype=bool)
    judged = np.log(appeal + 1e-3) + rng.normal(0.0, 0.45, len(items)) + rng.normal(0.0, 0.35, appeal.shape)
    for c in range(len(CLUSTERS)):
        for z in range(len(SIZES)):
            score = judged[c] + rng.normal(0.0, 0.15, len(items))
            score[~open_to] = -np.inf
            cell = _filled(score, segment, space, 0.97 * _BAYS[z] * BAY_CM)
            for s in np.flatnonzero((stores.cluster == c) & (stores.size == z)):
                present[s] = cell & ~(rng.random(len(items)) < 0.02)
                whim = rng.permutation(np.flatnonzero(open_to & ~cell))[:2]
                _fill_shelf(present[s], whim, space, stores.first_space_cm[s])
                _clear_shelf(present[s], score, space, stores.first_space_cm[s])
                missing = np.argsort(-np.where(open_to & ~present[s], score, -np.inf))[:8]
                _fill_shelf(present[s], missing, space, stores.first_space_cm[s] - 0.4 * BAY_CM)
    return present


def _fill_shelf(row: Bools, candidates: Ints, space: Floats, room: float) -> None:
    """Takes candidates into ``row`` (J,) in their order while they fit."""
    for j in candidates:
        if not row[j] and space[row].sum() + space[j] <= room:
            row[j] = True


def _clear_shelf(row: Bools, score: Floats, space: Floats, room: float) -> None:
    """Takes the lowest scores out of ``row`` (J,) until the rest fits."""
    while space[row].sum() > room:
        row[np.argmin(np.where(row, score, np.inf))] = False


def _filled(score: Floats, segment: Ints, space: Floats, room: float) -> Bools:
    """The best of every segment, then the best of all while there is room."""
    chosen = np.zeros(score.size, dtype=bool)
    for g in range(int(segment.max()) + 1):
        mine = np.flatnonzero(segment == g)
        chosen[mine[np.argsort(-score[mine])[:2]]] = True
    for j in np.argsort(-score):
        if np.isfinite(score[j]) and not chosen[j] and space[chosen].sum() + space[j] <= room:
            chosen[j] = True
    return chosen


@dataclass(frozen=True)
class _Desk:
    """What lies on the table at a review.

    space (J,), room (S,): cm.  rate (C, J): units per store and week on the shelf lately.
    """

    items: tuple[ItemFacts, ...]
    stores: Stores
    space: Floats
    room: Floats
    keep: Bools
    rate: Floats
    rng: np.random.Generator


def review(
    number: int,
    items: tuple[ItemFacts, ...],
    stores: Stores,
    space: Floats,
    keep: Bools,
    present: Bools,
    rate: Floats,
    settings: DemoSettings,
    rng: np.random.Generator,
) -> list[Move]:
    """The moves of review 1 or 2, from the present ranges (S, J) and recent rates of sale (C, J)."""
    first = settings.review_weeks[number - 1]
    desk = _Desk(items, stores, space, stores.space_in(first), keep, rate, rng)
    wanted = present.copy()
    launched = _launch(desk, number, wanted)
    dropped_by_supplier = _drop_supplier(desk, wanted, launched)
    touched = launched | dropped_by_supplier
    _drop_slow(desk, wanted, touched)
    _reshuffle(desk, wanted, touched)
    _fit(desk, wanted, touched)
    delay = settings.cluster_delay if number == 1 else settings.size_delay
    of_store = stores.cluster if number == 1 else stores.size
    late = rng.random(len(stores.code)) < 0.15
    moves = []
    for s, j in zip(*np.nonzero(wanted != present), strict=True):
        week = first + delay[of_store[s]] + int(late[s])
        cleared = bool(present[s, j] and not dropped_by_supplier[j])
        moves.append(Move(int(week), int(s), int(j), bool(wanted[s, j]), cleared))
    return moves


def _mean_rate(desk: _Desk) -> Floats:
    """Mean rate of sale over the clusters that carry the item, (J,)."""
    known = np.isfinite(desk.rate)
    total = np.where(known, desk.rate, 0.0).sum(axis=0)
    return np.where(known.any(axis=0), total / np.maximum(known.sum(axis=0), 1), np.nan)


def _launch(desk: _Desk, number: int, wanted: Bools) -> Bools:
    """New items: everywhere, in the bigger stores, or in some clusters."""
    new = np.array([item.launch == number for item in desk.items])
    some = desk.rng.permutation(len(CLUSTERS))
    cluster, size = desk.stores.cluster, desk.stores.size
    patterns = (
        np.ones(cluster.size, dtype=bool),
        size >= 1,
        cluster != some[0],
        (cluster == some[1]) | (size == 2),
        (cluster != some[2]) & (size >= 1),
    )
    for k, j in enumerate(desk.rng.permutation(np.flatnonzero(new))):
        wanted[patterns[k % len(patterns)], j] = True
    return new


def _drop_supplier(desk: _Desk, wanted: Bools, touched: Bools) -> Bools:
    """One supplier's terms fail in some clusters: good sellers go with the others."""
    suppliers = sorted({brand.supplier for brand in BRANDS if not brand.own_label})
    supplier = suppliers[desk.rng.integers(len(suppliers))]
    theirs = np.array(
        [BRANDS[i.brand].supplier == supplier and not BRANDS[i.brand].own_label for i in desk.items]
    )
    able = np.flatnonzero(theirs & ~touched & ~desk.keep & wanted.any(axis=0))
    best = able[np.argsort(-np.nan_to_num(_mean_rate(desk)[able]))]
    chosen = [*best[:1], *desk.rng.permutation(best[1:])[:2]]
    gone = np.zeros(len(desk.items), dtype=bool)
    for j in chosen:
        out = desk.rng.permutation(len(CLUSTERS))[: desk.rng.integers(1, 3)]
        wanted[np.isin(desk.stores.cluster, out), j] = False
        gone[j] = True
    return gone


def _drop_slow(desk: _Desk, wanted: Bools, touched: Bools) -> None:
    """The slowest items go, in most clusters; the judgement is not exact."""
    judged = np.log(np.maximum(_mean_rate(desk), 0.05)) + desk.rng.normal(0.0, 0.35, len(desk.items))
    spread = wanted.mean(axis=0) > 0.35
    able = np.flatnonzero(~touched & ~desk.keep & spread & np.isfinite(judged))
    for j in able[np.argsort(judged[able])[:4]]:
        out = desk.rng.random(len(CLUSTERS)) < 0.65
        out[desk.rng.integers(len(CLUSTERS))] = True
        wanted[out[desk.stores.cluster], j] = False
        touched[j] = True


def _reshuffle(desk: _Desk, wanted: Bools, touched: Bools) -> None:
    """Good items of the bigger stores go into all stores of a cluster, weak ones leave small stores."""
    for direction in (1.0, -1.0):
        for c in desk.rng.permutation(len(CLUSTERS))[:2]:
            here = desk.stores.cluster == c
            small = here & (desk.stores.size == 0)
            part = wanted[small].mean(axis=0)
            able = ~touched & ~desk.keep & np.isfinite(desk.rate[c])
            able &= part < 0.3 if direction > 0 else part > 0.7
            able &= wanted[here].any(axis=0)
            spots = np.flatnonzero(able)
            if not spots.size:
                continue
            score = direction * np.log(np.maximum(desk.rate[c, spots], 0.05))
            j = spots[np.argmax(score + desk.rng.normal(0.0, 0.25, spots.size))]
            if direction > 0:
                wanted[here, j] = True
            else:
                wanted[small, j] = False
            touched[j] = True


def _fit(desk: _Desk, wanted: Bools, touched: Bools) -> None:
    """Too full: the slowest untouched items go; half a bay empty: the best missing items come."""
    for s in range(wanted.shape[0]):
        rate = np.nan_to_num(desk.rate[desk.stores.cluster[s]], nan=-1.0)
        held = np.where(desk.keep | touched, np.inf, rate)
        _clear_shelf(wanted[s], held, desk.space, desk.room[s])
        able = np.flatnonzero(~wanted[s] & ~touched & (rate > 0.0))
        best = able[np.argsort(-rate[able])][:3]
        _fill_shelf(wanted[s], best, desk.space, desk.room[s] - 0.3 * BAY_CM)


def refit(
    store: int, stores: Stores, space: Floats, keep: Bools, present: Bools, rate: Floats, week: int
) -> list[Move]:
    """The moves of a store whose shelf changes by a bay this week.  present (S, J), rate (C, J)."""
    row = present[store].copy()
    known = np.nan_to_num(rate[stores.cluster[store]], nan=-1.0)
    _clear_shelf(row, np.where(keep, np.inf, known), space, stores.space_cm[store])
    able = np.flatnonzero(~row & (known > 0.0))
    _fill_shelf(row, able[np.argsort(-known[able])], space, stores.space_cm[store])
    return [Move(week, store, int(j), bool(row[j])) for j in np.flatnonzero(row != present[store])]


def single_moves(
    stores: Stores, n_items: int, settings: DemoSettings, rng: np.random.Generator
) -> list[Move]:
    """What single stores do on their own: now and then an item is dropped, or one is tried."""
    moves = []
    for s in range(len(stores.code)):
        for _ in range(int(rng.poisson(1.3))):
            week = int(rng.integers(4, settings.weeks - 6))
            moves.append(Move(week, s, int(rng.integers(n_items)), bool(rng.random() < 0.4)))
    return moves
