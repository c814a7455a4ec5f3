"""Facts about substitution with published values, through planner's public functions."""

import numpy as np
import pytest

from planner.demand.store_demand import StoreDemand
from planner.transfer.rules import proportional


def one_store(attraction: list[float], segment: list[int], dissimilarity: list[float]) -> StoreDemand:
    """A store where everybody buys: category volume fixed at 1 (scale 1, W ** 0 in the limit)."""
    return StoreDemand(
        attraction=np.array([[attraction]]),
        dissimilarity=np.array([dissimilarity]),
        category_dissimilarity=np.array([1.0]),
        scale=np.array([[1.0]]),
        segment=np.array(segment),
        cluster=np.array([0]),
        shoppers=None,
    )


def shares(demand: StoreDemand, present: list[int] | None = None) -> np.ndarray:
    """Shares among the items."""
    on = np.ones((1, demand.segment.size)) if present is None else np.array([present], dtype=float)
    units = demand.units(on)[0, 0]
    return units / units.sum()


def test_duplicate_of_an_item_under_the_plain_logit():
    """[V-2] Two equal items hold a half each, with an exact copy a third each.

    Debreu 1960 (review of Luce, AER 50); McFadden 1974; Train 2009, ch. 3.
    """
    demand = one_store([1.0, 1.0, 1.0], [0, 0, 0], [1.0])
    np.testing.assert_allclose(shares(demand, [1, 1, 0]), [0.5, 0.5, 0.0], atol=1e-12)
    np.testing.assert_allclose(shares(demand), np.full(3, 1 / 3), atol=1e-12)


@pytest.mark.parametrize(
    ("dissimilarity", "lone"),
    [(1.0, 1 / 3), (0.5, 0.4142135624), (0.1, 0.4826782552), (0.01, 0.4982671390)],
)
def test_duplicate_of_an_item_inside_a_nest(dissimilarity, lone):
    """[V-2] The two copies share a nest: lone share 1 / (1 + 2^L). McFadden 1978; Train 2009, ch. 4."""
    demand = one_store([1.0, 1.0, 1.0], [0, 0, 1], [dissimilarity, 1.0])
    found = shares(demand)
    assert found[2] == pytest.approx(lone, abs=1e-9)
    assert found[0] == pytest.approx((1.0 - lone) / 2.0, abs=1e-9)


@pytest.mark.parametrize("third", ["removed", "re-priced"])
def test_ratio_of_two_items_never_depends_on_a_third_under_the_plain_logit(third):
    """[V-2] P_i / P_j is unchanged (McFadden 1974); across nests of a nested logit it is not."""
    attraction = [1.3, 0.7, 2.1, 0.9]
    plain = one_store(attraction, [0, 0, 0, 0], [1.0])
    nested = one_store(attraction, [0, 0, 1, 1], [0.3, 0.6])
    for demand, across_changes in ((plain, False), (nested, True)):
        before = shares(demand)
        if third == "removed":
            after = shares(demand, [1, 1, 1, 0])
        else:
            moved = [1.3, 0.7, 2.1, 0.5]
            after = shares(one_store(moved, list(demand.segment), list(demand.dissimilarity[0])))
        assert after[0] / after[1] == pytest.approx(before[0] / before[1], abs=1e-12)
        changed = abs(after[0] / after[2] - before[0] / before[2]) > 1e-3
        assert changed == across_changes


def test_plain_logit_diversion_is_the_proportional_rule():
    """[V-2] D(j->k) = s_k / (1 - s_j), outside included; rows sum to 1.

    Conlon & Mortimer 2021 (RAND J. Econ. 52(4)), the plain logit case.
    """
    demand = StoreDemand(
        attraction=np.array([[[0.4, 0.8, 0.3, 0.6]]]),
        dissimilarity=np.array([[1.0]]),
        category_dissimilarity=np.array([1.0]),
        scale=np.array([[1.0]]),
        segment=np.zeros(4, dtype=np.int64),
        cluster=np.array([0]),
        shoppers=np.array([1000.0]),
    )
    before = demand.units(np.ones((1, 4)))[0, 0]
    for j in range(4):
        present = np.ones((1, 4))
        present[0, j] = 0.0
        after = demand.units(present)[0, 0]
        gained = np.append(after - before, before.sum() - after.sum()) / before[j]
        gained[j] = 0.0
        rule = proportional(before, 1000.0, np.arange(4) == j)
        np.testing.assert_allclose(gained, rule, atol=1e-10)
        assert gained.sum() == pytest.approx(1.0, abs=1e-10)


def test_transfer_table_of_four_alternatives_has_the_nested_structure():
    """[MEM, structure checked] Train 2009, table 4.1: nests {first two}, {last two}, shares .40 .10 .30 .20.

    Removing the first raises both of the other nest by the same percentage, and its nest mate
    by more; the first column is reproduced by a dissimilarity of .86135.
    """
    lam = 0.86135
    share = np.array([0.40, 0.10, 0.30, 0.20])
    segment = np.array([0, 0, 1, 1])
    nest = np.array([0.5, 0.5])[segment]
    # v with P = D^lam / W * v / D: choose D_g = nest share^(1/lam), v = within share x D.
    attraction = share / nest * nest ** (1.0 / lam)
    demand = one_store(list(attraction), [0, 0, 1, 1], [lam, lam])
    np.testing.assert_allclose(shares(demand), share, atol=1e-12)
    without = shares(demand, [0, 1, 1, 1])
    np.testing.assert_allclose(without, [0.0, 0.20, 0.48, 0.32], atol=0.015)
    rise = without[1:] / share[1:]
    assert rise[1] == pytest.approx(rise[2], abs=1e-12)
    assert rise[0] > rise[1]
