"""Units summed over the stores of a cluster, against the sum of single stores."""

from __future__ import annotations

import statistics
import time
from dataclasses import replace

import numpy as np
import pytest

from planner.demand.store_demand import Ints, StoreDemand
from planner.transfer.tally import tally
from planner.transfer.what_if import OUT, today_states, units_by_cluster
from tests.transfer.records import random_demand, random_fit


@pytest.mark.parametrize("with_shoppers", [False, True])
@pytest.mark.parametrize("seed", range(4))
def test_equal_to_the_sum_of_single_stores(seed: int, with_shoppers: bool) -> None:
    demand, today = random_demand(seed, 5, with_shoppers)
    # One store is empty, one cluster lacks a whole segment.
    today[0] = False
    today[2:4, 4:8] = False
    single = demand.units(today)
    expected = np.stack([single[:, demand.cluster == c].sum(axis=1) for c in range(3)], axis=1)
    np.testing.assert_allclose(units_by_cluster(demand, today), expected, rtol=1e-12, atol=1e-300)


def test_a_cluster_without_items_sells_nothing() -> None:
    demand, today = random_demand(1, 2, True)
    today[demand.cluster == 1] = False
    found = units_by_cluster(demand, today)
    assert (found[:, 1] == 0.0).all()
    assert (found[:, 0].sum(axis=1) > 0.0).all()


def test_the_tally_is_fast_at_the_demos_size() -> None:
    """The goal is 10 ms; this fails at five times the goal."""
    fitted, base = random_fit(1, with_shoppers=True)
    stores, items, draws = np.arange(36) % 6, np.arange(78) % 9, np.arange(200) % 30
    # Each store, item and draw of the small fit several times: 36 stores, 78 items, 200 draws.
    large = replace(
        fitted,
        estimate=_repeated(fitted.estimate, stores, items, np.zeros(1, dtype=int)),
        draws=_repeated(fitted.draws, stores, items, draws),
    )
    week = replace(
        base,
        today=base.today[np.ix_(stores, items)],
        price=base.price[:, items],
        margin=base.margin[:, items],
        net_price=base.net_price[:, items],
        space_cm=base.space_cm[items],
        space_limit=base.space_limit[stores],
    )
    states = today_states(week.today, large.estimate.cluster, 3)
    seconds = []
    for j in range(15):
        states[:, j] = OUT
        began = time.perf_counter()
        found = tally(large, week, states)
        seconds.append(time.perf_counter() - began)
    assert found.effects.draws_after.shape == (200, 3, 78)
    assert statistics.median(seconds) < 0.05, f"{1000 * statistics.median(seconds):.1f} ms"


def _repeated(demand: StoreDemand, stores: Ints, items: Ints, draws: Ints) -> StoreDemand:
    assert demand.shoppers is not None
    return replace(
        demand,
        attraction=demand.attraction[draws][:, :, items],
        dissimilarity=demand.dissimilarity[draws],
        category_dissimilarity=demand.category_dissimilarity[draws],
        scale=demand.scale[draws][:, stores],
        segment=demand.segment[items],
        cluster=demand.cluster[stores],
        shoppers=demand.shoppers[stores],
    )
