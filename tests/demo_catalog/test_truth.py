"""The truth: the same shoppers, worked out exactly, and not degenerate."""

from __future__ import annotations

import csv
import time
from collections import defaultdict

import numpy as np
import pytest
from numpy.typing import NDArray

from demo_catalog.generate import Demo
from demo_catalog.generator.lists import SEGMENTS
from tests.demo_catalog.test_files import FOLDER


def shelves(demo: Demo, seed: int, part: float = 0.6) -> NDArray[np.bool_]:
    """Random ranges (S, J)."""
    return np.random.default_rng(seed).random(demo.market.today.shape) < part


def test_units_are_what_each_household_takes_one_by_one(small: Demo) -> None:
    market, present = small.market, shelves(small, 1)
    by_hand = np.zeros(present.shape)
    for store, order, needs in zip(market.store, market.order, market.needs, strict=True):
        for j in order:
            if j == len(market.items):
                break
            if present[store, j]:
                by_hand[store, j] += needs
                break
    np.testing.assert_allclose(market.units(present), by_hand, rtol=0, atol=1e-9)


def test_margin_is_units_times_what_an_item_earns(small: Demo) -> None:
    market, present = small.market, shelves(small, 2)
    by_hand = 0.0
    units = market.units(present)
    for s, c in enumerate(market.cluster):
        for j in range(len(market.items)):
            by_hand += units[s, j] * (market.price[c, j] / (1 + market.vat[j]) - market.cost[j])
    assert market.margin(present) == pytest.approx(by_hand, rel=1e-12)


@pytest.mark.parametrize("seed", [3, 4, 5])
def test_removing_an_item_never_takes_units_from_a_rival(small: Demo, seed: int) -> None:
    market, present = small.market, shelves(small, seed)
    before = market.units(present)
    for i in range(0, len(market.items), 7):
        without = present.copy()
        without[:, i] = False
        change = market.units(without) - before
        change[:, i] = 0.0
        assert change.min() > -1e-9
        assert change.sum() <= before[:, i].sum() + 1e-9


def test_transfers_sum_to_the_lost_units(demo: Demo) -> None:
    truth = demo.truth
    sold = truth.units > 0
    np.testing.assert_allclose(truth.moved.sum(axis=2)[sold], truth.units[sold], rtol=1e-9)
    assert truth.moved.min() > -1e-9
    np.testing.assert_allclose(truth.moved[:-1].sum(axis=0), truth.moved[-1], atol=1e-9)
    np.testing.assert_allclose(truth.shares().sum(axis=2)[sold], 1.0, rtol=1e-9)


def test_a_delisting_in_the_table_is_a_recomputation(small: Demo) -> None:
    market, truth = small.market, small.truth
    i = int(np.argmax(truth.units[-1]))
    without = market.today.copy()
    without[:, i] = False
    after = market.units(without).sum(axis=0)
    gained = np.delete(truth.moved[-1, i, :-1], i)
    np.testing.assert_allclose(gained, np.delete(after - truth.units[-1], i), atol=1e-9)
    assert truth.moved[-1, i, -1] == pytest.approx(truth.units[-1].sum() - after.sum())


def test_an_offer_takes_from_others_and_adds_the_rest(demo: Demo) -> None:
    truth = demo.truth
    for n, j in enumerate(truth.offer_items):
        change = truth.offers[-1, n]
        assert change[j] > 0
        assert np.delete(change[:-1], j).max() < 1e-9
        assert change[-1] == pytest.approx(change[:-1].sum())
        assert 0.0 <= change[-1] < 0.4 * change[j]
        for c, offered in enumerate(truth.offered_to[n]):
            assert (truth.offers[c, n, j] > 0) == offered


def test_the_written_transfers_sum_to_one() -> None:
    sums: dict[tuple[str, str], float] = defaultdict(float)
    with (FOLDER / "truth" / "transfers.csv").open(encoding="utf-8", newline="") as file:
        for row in csv.DictReader(file):
            sums[row["cluster"], row["delisted"]] += float(row["share"])
    assert len(sums) > 150
    assert max(abs(total - 1.0) for total in sums.values()) < 1e-3


def test_the_ordinary_week_is_like_the_last_weeks(demo: Demo) -> None:
    lately = demo.history.units[-demo.settings.ordinary_weeks :].mean(axis=0)
    assert demo.truth.units[-1].sum() == pytest.approx(lately.sum(), rel=0.06)
    # Stores differ by chance only: five standard deviations of a mean of 13 weeks.
    expected = demo.market.units(demo.market.today).sum(axis=1)
    assert np.abs(lately.sum(axis=1) / expected - 1.0).max() < 0.2


def test_segments_are_partly_closed_and_differ(demo: Demo) -> None:
    truth = demo.truth
    segment = np.array([item.segment for item in demo.items])
    stays = truth.moved[-1, :, :-1]
    inside = np.array([stays[i, segment == segment[i]].sum() for i in range(segment.size)])
    closure = [inside[segment == g].sum() / stays[segment == g].sum() for g in range(len(SEGMENTS))]
    assert 0.4 < min(closure) < max(closure) - 0.1
    assert max(closure) < 0.95
    assert 0.55 < inside.sum() / stays.sum() < 0.85
    leaves = truth.moved[-1, :, -1].sum() / truth.units[-1].sum()
    assert 0.04 < leaves < 0.10


def test_the_proportional_rule_is_far_off(demo: Demo) -> None:
    market, truth = demo.market, demo.truth
    units = market.units(market.today)
    largest = np.argsort(-truth.units[-1])[:10]
    wrong = 0.0
    for i in largest:
        others = units[market.today[:, i]].copy()
        lost = others[:, i].copy()
        others[:, i] = 0.0
        rule = (others / others.sum(axis=1, keepdims=True) * lost[:, None]).sum(axis=0)
        real = truth.moved[-1, i, :-1]
        wrong += 0.5 * np.abs(rule / rule.sum() - real / real.sum()).sum() * truth.units[-1, i]
    assert wrong / truth.units[-1, largest].sum() > 0.3


def test_any_assortment_is_worked_out_quickly(demo: Demo) -> None:
    present = shelves(demo, 6)
    began = time.process_time()
    demo.market.margin(present)
    assert time.process_time() - began < 0.5
