"""Transfers against brute recomputation, published duplicates and third-item facts, closed forms."""

import dataclasses

import numpy as np
import pytest

from planner.demand.store_demand import StoreDemand
from planner.transfer.delistings import delistings
from planner.transfer.rules import proportional, proportional_in_segment, transfer_error
from planner.transfer.tally import tally
from planner.transfer.what_if import AS_TODAY, IN, OUT, presence, today_states, what_if
from tests.transfer.records import random_demand, random_fit


def brute_units(demand: StoreDemand, k: int, present: np.ndarray) -> np.ndarray:
    """The formulas of StoreDemand's docstring, one store and item at a time."""
    n_stores, n_items = present.shape
    units = np.zeros((n_stores, n_items))
    for s in range(n_stores):
        v = [present[s, j] * demand.attraction[k, demand.cluster[s], j] for j in range(n_items)]
        lam_c = demand.category_dissimilarity[k]
        totals, levels = {}, {}
        for g in range(demand.dissimilarity.shape[1]):
            totals[g] = sum(v[j] for j in range(n_items) if demand.segment[j] == g)
            power = demand.dissimilarity[k, g] / lam_c
            levels[g] = totals[g] ** power if totals[g] > 0.0 else 0.0
        inclusive = sum(levels.values())
        if inclusive == 0.0:
            continue
        volume = demand.scale[k, s] * inclusive**lam_c
        if demand.shoppers is not None:
            volume = demand.shoppers[s] * volume / (1.0 + volume)
        for j in range(n_items):
            g = demand.segment[j]
            if v[j] > 0.0:
                units[s, j] = volume * levels[g] / inclusive * v[j] / totals[g]
    return units


@pytest.mark.parametrize("with_shoppers", [False, True])
@pytest.mark.parametrize("seed", range(4))
def test_units_equal_the_formula_item_by_item(seed, with_shoppers):
    demand, today = random_demand(seed, 3, with_shoppers)
    for k in range(3):
        np.testing.assert_allclose(demand.units(today)[k], brute_units(demand, k, today), rtol=1e-12)


@pytest.mark.parametrize("with_shoppers", [False, True])
@pytest.mark.parametrize("seed", range(4))
def test_delistings_equal_brute_recomputation(seed, with_shoppers):
    fitted, base = random_fit(seed, with_shoppers)
    found = delistings(fitted, base)
    before = brute_units(fitted.estimate, 0, base.today)
    margin = base.margin[fitted.estimate.cluster]
    for j in range(9):
        if not base.today[:, j].any():
            assert np.isnan(found.stays[j])
            continue
        without = base.today.copy()
        without[:, j] = False
        after = brute_units(fitted.estimate, 0, without)
        moved = (after - before).sum(axis=0)
        np.testing.assert_allclose(found.moved[j, :-1], moved, rtol=1e-9, atol=1e-10)
        assert found.moved[j, -1] == pytest.approx(-moved.sum(), abs=1e-9)
        assert found.stays[j] == pytest.approx(1.0 + moved.sum() / before[:, j].sum(), abs=1e-9)
        change = ((after - before) * margin).sum()
        assert found.margin_change[j] == pytest.approx(change, abs=1e-8)


def test_delisting_intervals_equal_recomputed_draws():
    fitted, base = random_fit(2, with_shoppers=True)
    found = delistings(fitted, base)
    item = 1
    without = base.today.copy()
    without[:, item] = False
    stays, margins = [], []
    margin = base.margin[fitted.draws.cluster]
    for k in range(fitted.draws.n_draws):
        before, after = brute_units(fitted.draws, k, base.today), brute_units(fitted.draws, k, without)
        stays.append(1.0 - (before.sum() - after.sum()) / before[:, item].sum())
        margins.append(((after - before) * margin).sum())
    assert found.stays_low[item] == pytest.approx(np.quantile(stays, 0.1), abs=1e-9)
    assert found.stays_high[item] == pytest.approx(np.quantile(stays, 0.9), abs=1e-9)
    assert found.margin_low[item] == pytest.approx(np.quantile(margins, 0.1), abs=1e-8)


def test_a_set_of_changes_is_recomputed_as_a_set():
    fitted, base = random_fit(7)
    cluster = fitted.estimate.cluster
    states = today_states(base.today, cluster, 3)
    states[:, 1] = OUT
    states[0, 2] = OUT
    states[1, 3] = IN
    after = presence(states, base.today, cluster)
    found = what_if(fitted, base.today, after)
    expected = brute_units(fitted.estimate, 0, after)
    for c in range(3):
        np.testing.assert_allclose(found.after[c], expected[cluster == c].sum(axis=0), rtol=1e-12)


def test_states_and_presence_round_trip():
    _, base = random_fit(3)
    cluster = np.array([0, 0, 1, 1, 2, 2])
    states = today_states(base.today, cluster, 3)
    assert set(np.unique(states)) <= {OUT, IN, AS_TODAY}
    np.testing.assert_array_equal(presence(states, base.today, cluster), base.today)


def test_tally_of_today_changes_nothing_and_of_a_delisting_matches():
    fitted, base = random_fit(4)
    cluster = fitted.estimate.cluster
    today = today_states(base.today, cluster, 3)
    same = tally(fitted, base, today)
    assert same.changes == 0
    assert same.margin.change == 0.0
    assert (same.margin.low, same.margin.high) == (0.0, 0.0)
    states = today.copy()
    states[:, 0] = OUT
    less = tally(fitted, base, states)
    found = delistings(fitted, base)
    assert less.changes == 3
    assert less.margin.change == pytest.approx(found.margin_change[0])
    assert less.units.change == pytest.approx(-found.moved[0, -1])
    assert less.margin.low <= less.margin.high
    assert less.items[1] == less.items[0] - 1
    assert (less.space_used <= same.space_used).all()


def test_price_change_moves_sales_to_near_items_first():
    fitted, _base = random_fit(9)
    demand = dataclasses.replace(
        fitted.estimate,
        price_effect=np.full((1, 3), -2.0),
        dissimilarity=np.full((1, 3), 0.2),
        category_dissimilarity=np.array([0.8]),
    )
    present = np.ones((6, 9))
    ratio = np.ones((3, 9))
    ratio[:, 0] = 1.1
    change = (demand.with_prices(ratio).units(present) / demand.units(present) - 1.0)[0]
    assert (change[:, 0] < 0.0).all()
    assert (change[:, 1] > change[:, 5]).all()
    np.testing.assert_allclose(change[:, 4], change[:, 8], rtol=1e-9)


def test_proportional_rule_with_and_without_shoppers():
    units = np.array([30.0, 10.0, 60.0])
    removed = np.array([True, False, False])
    np.testing.assert_allclose(proportional(units, None, removed), [0.0, 1 / 7, 6 / 7, 0.0])
    np.testing.assert_allclose(proportional(units, 200.0, removed), [0.0, 10 / 170, 60 / 170, 100 / 170])
    np.testing.assert_allclose(proportional_in_segment(units, np.array([0, 0, 1]), 0), [0.0, 1.0, 0.0, 0.0])


def test_transfer_error_is_half_the_absolute_difference_weighted_by_volume():
    estimated = np.array([[0.0, 0.5, 0.5], [0.2, 0.0, 0.8]])
    true = np.array([[0.0, 1.0, 0.0], [0.2, 0.0, 0.8]])
    assert transfer_error(estimated, true, np.array([3.0, 1.0])) == pytest.approx(0.375)
