"""Published facts about best assortments, through the optimiser's public functions."""

import numpy as np
import pytest

from planner.demand.store_demand import StoreDemand
from planner.optimise.problem import AssortmentProblem, SolverSettings
from planner.optimise.solve import best_assortment


def problem(
    attraction: np.ndarray,
    value: np.ndarray,
    segment: np.ndarray,
    dissimilarity: np.ndarray,
    most_items: float,
) -> AssortmentProblem:
    """One store with one shopper and an outside option (scale 1): R = sum of P_j m_j."""
    n = attraction.size
    none = np.zeros((1, n), dtype=bool)
    return AssortmentProblem(
        demand=StoreDemand(
            attraction=attraction[None, None],
            dissimilarity=dissimilarity[None],
            category_dissimilarity=np.array([1.0]),
            scale=np.array([[1.0]]),
            segment=segment,
            cluster=np.array([0]),
            shoppers=np.array([1.0]),
        ),
        today=none.copy(),
        value=value[None],
        space=np.ones(n),
        space_limit=np.array([float(n)]),
        min_items=np.array([0.0]),
        max_items=np.array([most_items]),
        keep=none,
        never=none,
        locked=none,
    )


EXACT = SolverSettings(seconds=30.0, gap=1e-10, starts=3)


def test_plain_logit_best_set_is_a_margin_order_prefix():
    """[V-2] Unconstrained plain logit: some top-k by margin is best.

    Talluri & van Ryzin 2004 (Management Science 50(1)); Davis, Gallego & Topaloglu 2013.
    """
    rng = np.random.default_rng(1)
    for _case in range(25):
        v, m = rng.uniform(0.05, 2.0, 8), rng.uniform(0.5, 10.0, 8)
        found = best_assortment(problem(v, m, np.zeros(8, dtype=int), np.ones(1), 8), EXACT)
        order = np.argsort(-m)
        prefixes = [(v[order[:k]] * m[order[:k]]).sum() / (1.0 + v[order[:k]].sum()) for k in range(1, 9)]
        assert found.value == pytest.approx(max(prefixes), abs=1e-8)


def test_nested_logit_best_set_is_a_prefix_inside_every_nest():
    """[V-2] Dissimilarity <= 1, outside option at the top only (Davis, Gallego & Topaloglu 2014)."""
    rng = np.random.default_rng(2)
    for _case in range(25):
        segment = np.array([0, 0, 0, 1, 1, 1, 2, 2])
        v, m = rng.uniform(0.05, 2.0, 8), rng.uniform(0.5, 10.0, 8)
        found = best_assortment(problem(v, m, segment, rng.uniform(0.2, 1.0, 3), 8), EXACT)
        for g in range(3):
            listed = m[(segment == g) & (found.states[0] == 1)]
            left_out = m[(segment == g) & (found.states[0] == 0)]
            assert not listed.size or not left_out.size or listed.min() > left_out.max()


def test_small_limited_example():
    """[V-1] Margins 7 3 9 10, weights .5 .8 .1 .7, at most 2: items 1 and 4 bring 4.772727."""
    v, m = np.array([0.5, 0.8, 0.1, 0.7]), np.array([7.0, 3.0, 9.0, 10.0])
    found = best_assortment(problem(v, m, np.zeros(4, dtype=int), np.ones(1), 2), EXACT)
    assert found.value == pytest.approx(4.772727, abs=1e-6)
    np.testing.assert_array_equal(found.states[0], [1, 0, 0, 1])
