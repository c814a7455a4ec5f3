"""Individual households and what they would put up with.

No utility here is drawn from a distribution that gives a logit: tastes come as
discrete types, two-sided exponentials, uniforms and mixtures; a household looks
only at items it considers, takes the best one on the shelf, and goes without when
nothing comes close enough to what it likes most.  A household has three kinds of
need (the usual one, another hour of the day or another member of the household,
and trying something), each with an order of liking of its own.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from demo_catalog.generator.lists import BRANDS, FLAVOURS, ItemFacts, key_of
from demo_catalog.generator.prices import ItemMoney
from demo_catalog.generator.settings import DemoSettings

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

MOODS = 3

# Liking of the seven segments by type of household, and how common the types are by cluster.
_TYPES = np.array(
    [
        [3.35, 0.3, -0.85, -1.1, -0.7, -1.0, 0.15],
        [4.5, -1.25, -1.8, -1.95, -1.8, -1.55, -0.85],
        [0.15, 3.65, 0.3, 0.55, -0.4, -0.4, 0.3],
        [-0.85, 0.15, 3.2, 1.55, 0.4, 0.4, -0.85],
        [-1.1, 0.3, 1.25, 3.9, 0.15, 0.3, 0.0],
        [-0.7, -1.0, 0.4, 0.0, 3.35, 0.85, 0.55],
        [-0.7, -0.4, 0.15, 0.3, 0.7, 3.8, 0.85],
        [0.3, 0.15, -1.25, 0.15, 0.15, 0.55, 5.05],
        [0.85, 0.85, 0.85, 0.85, 0.85, 0.7, 1.1],
    ]
)
_MIX = np.array(
    [
        [0.17, 0.09, 0.10, 0.15, 0.10, 0.12, 0.07, 0.07, 0.13],
        [0.14, 0.12, 0.08, 0.16, 0.08, 0.17, 0.06, 0.06, 0.13],
        [0.13, 0.06, 0.14, 0.13, 0.12, 0.10, 0.08, 0.11, 0.13],
    ]
)


@dataclass(frozen=True)
class Households:
    """Buyers of the category.  H households, N = 3 H kinds of need, L items considered at most.

    store (H,), rate (H,): needs per week in a week of average season.
    weight (H, 3): how often each kind of need.  stores_up (H,): buys two on a good promotion.
    item (N, L): items considered, -1 after the last.  liking (N, L): without price and season.
    price_weight (N,): liking lost per unit of ln price.  least (N,): liking below which the
    household goes without.  aware (N, L): weeks until a newcomer is noticed.
    Row 3 h + m holds need m of household h.
    """

    store: Ints
    rate: Floats
    weight: Floats
    stores_up: NDArray[np.bool_]
    item: Ints
    liking: Floats
    price_weight: Floats
    least: Floats
    aware: Ints


@dataclass(frozen=True)
class _Marks:
    """The items' attributes as arrays (J,)."""

    segment: Ints
    brand: Ints
    flavour: Ints
    size: Floats
    strength: Floats
    caffeine: Floats
    organic: Floats
    own: Floats
    copy_of: Ints


def _marks(items: tuple[ItemFacts, ...]) -> _Marks:
    place = {key_of(item): j for j, item in enumerate(items)}
    return _Marks(
        segment=np.array([item.segment for item in items]),
        brand=np.array([item.brand for item in items]),
        flavour=np.array([item.flavour for item in items]),
        size=np.log(np.array([item.bags for item in items]) / 20.0),
        strength=np.array([item.strength for item in items]),
        caffeine=np.array([float(item.caffeine) for item in items]),
        organic=np.array([float(item.organic) for item in items]),
        own=np.array([float(BRANDS[item.brand].own_label) for item in items]),
        copy_of=np.array([place[item.like] if item.like else -1 for item in items]),
    )


def draw_households(
    items: tuple[ItemFacts, ...],
    money: ItemMoney,
    cluster: Ints,
    size: Ints,
    settings: DemoSettings,
    rng: np.random.Generator,
) -> Households:
    """All households of all stores.  cluster, size (S,)."""
    marks = _marks(items)
    parts = [
        _one_store(s, marks, money, int(cluster[s]), int(size[s]), settings, rng) for s in range(cluster.size)
    ]
    return Households(*(np.concatenate([part[k] for part in parts]) for k in range(len(parts[0]))))


def _mixture(rng: np.random.Generator, n: int, values: list[float], chances: list[float]) -> Floats:
    return rng.choice(np.array(values), size=n, p=chances)


def _liking(marks: _Marks, money: ItemMoney, mix: Floats, n: int, rng: np.random.Generator) -> Floats:
    """Lasting liking (n, J) without price."""
    kind = rng.choice(mix.size, size=n, p=mix)
    n_segments = _TYPES.shape[1]
    by_segment = _TYPES[kind] + rng.laplace(0.0, 0.6, (n, n_segments))
    liking = by_segment[:, marks.segment]
    liking += rng.laplace(0.0, 0.35, (n, len(FLAVOURS)))[:, marks.flavour]
    by_brand = rng.laplace(0.0, 0.2, (n, len(BRANDS)))
    by_brand += np.where(rng.random(by_brand.shape) < 0.2, rng.exponential(0.7, by_brand.shape), 0.0)
    by_brand -= np.where(rng.random(by_brand.shape) < 0.08, 9.0, 0.0)
    liking += by_brand[:, marks.brand]
    liking += rng.uniform(-0.8, 0.8, n)[:, None] * marks.caffeine
    liking -= rng.uniform(0.2, 1.2, n)[:, None] * np.abs(rng.beta(2.0, 2.0, n)[:, None] - marks.strength)
    pack = _mixture(rng, n, [0.0, 0.7, 1.4], [0.5, 0.3, 0.2]) + rng.uniform(-0.2, 0.2, n)
    liking -= rng.exponential(0.45, n)[:, None] * np.abs(marks.size[None, :] - pack[:, None])
    liking += _mixture(rng, n, [0.9, 0.0, -0.3], [0.15, 0.75, 0.10])[:, None] * marks.organic
    liking += rng.uniform(0.5, 1.5, n)[:, None] * money.quality
    own = rng.laplace(0.0, 0.55, liking.shape)
    for j in np.flatnonzero(marks.copy_of >= 0):
        own[:, j] = 0.85 * own[:, marks.copy_of[j]] + 0.5 * own[:, j]
    return liking + own


def _one_store(
    store: int,
    marks: _Marks,
    money: ItemMoney,
    cluster: int,
    size: int,
    settings: DemoSettings,
    rng: np.random.Generator,
) -> tuple[NDArray[Any], ...]:
    n = round(settings.households[size] * rng.uniform(0.88, 1.12))
    mix = rng.dirichlet(_MIX[cluster] * 90.0)
    lasting = _liking(marks, money, mix, n, rng)
    price_weight = np.minimum(0.5 + rng.exponential(0.8, n), 4.0)
    attitude = _mixture(rng, n, [-0.6, 0.1, 0.5], [0.25, 0.45, 0.30]) + rng.uniform(-0.2, 0.2, n)
    lasting += (attitude + 0.12 * (price_weight - 1.3))[:, None] * marks.own
    # Half of the price is judged per serving: big packs are not simply dear.
    lasting += (0.5 * price_weight)[:, None] * marks.size[None, :]
    price = -price_weight[:, None] * np.log(money.regular[0, cluster])[None, :]
    loyal = _mixture(rng, n, [0.1, 0.8, 1.8], [0.3, 0.5, 0.2])
    favourites = np.argsort(-(lasting + price + rng.uniform(-0.5, 0.5, lasting.shape)), axis=1)[:, :3]
    habit = np.zeros_like(lasting)
    np.put_along_axis(habit, favourites, loyal[:, None] * np.array([1.0, 0.6, 0.35]), axis=1)
    hour = rng.laplace(0.0, 0.7, (n, _TYPES.shape[1]))[:, marks.segment]
    hour += rng.choice(np.array([-1.0, 0.6]), n)[:, None] * marks.caffeine
    moods = (
        lasting + habit,
        lasting + 0.5 * habit + hour,
        lasting + rng.laplace(0.0, 0.7, lasting.shape),
    )
    usual = rng.uniform(0.55, 0.95, n)
    other = (1.0 - usual) * rng.uniform(0.4, 0.9, n)
    weight = np.stack([usual, other, 1.0 - usual - other], axis=1)
    least, shape, scale = settings.tolerance
    tolerance = least + rng.gamma(shape, scale, n)
    picked = [_considered(mood, price, tolerance, settings) for mood in moods]
    item, liking, floor = (np.stack([part[k] for part in picked], axis=1) for k in range(3))
    width = settings.considered
    return (
        np.full(n, store),
        np.minimum(rng.gamma(settings.need_shape, settings.need_rate / settings.need_shape, n), 0.6),
        weight,
        rng.random(n) < 0.3,
        item.reshape(n * MOODS, width),
        liking.reshape(n * MOODS, width),
        np.repeat(price_weight, MOODS),
        floor.reshape(n * MOODS),
        np.minimum(np.floor(rng.exponential(2.5, (n * MOODS, width))), 14).astype(np.int64),
    )


def _considered(
    mood: Floats, price: Floats, tolerance: Floats, settings: DemoSettings
) -> tuple[Ints, Floats, Floats]:
    """Items near enough to the best: positions (n, L), liking without price (n, L), least liking (n,)."""
    total = mood + price
    order = np.argsort(-total, axis=1)[:, : settings.considered]
    value = np.take_along_axis(total, order, axis=1)
    least = value[:, 0] - tolerance
    # A little more than what is accepted today, so that a price cut can bring an item in.
    near = value >= least[:, None] - 0.6
    return (
        np.where(near, order, -1),
        np.where(near, np.take_along_axis(mood, order, axis=1), 0.0),
        least,
    )
