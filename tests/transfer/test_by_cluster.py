"""Units summed over the stores of a cluster, against the sum of single stores."""

from __future__ import annotations

import numpy as np
import pytest

from planner.transfer.what_if import units_by_cluster
from tests.transfer.records import random_demand


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
