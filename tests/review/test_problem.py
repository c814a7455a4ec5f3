"""From limits in words to the arrays of the problem."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.base.errors import CallError
from planner.demand.fitted import FittedModel
from planner.plan.limits import ClusterLimit, ItemLock, Limits
from planner.review.jobs import FitDone
from planner.review.problem import goal_values, listed_again, pose_problem
from planner.sales.report import LoadedData
from planner.transfer.what_if import IN, today_states

NORTH, SOUTH = 0, 1


@pytest.fixture
def fitted(fit: FitDone) -> FittedModel:
    return fit.fitted


def at(loaded: LoadedData, item: str) -> int:
    return loaded.catalogue.item_index()[item]


def with_item(loaded: LoadedData, item: str, **fields: object) -> LoadedData:
    items = tuple(replace(i, **fields) if i.code == item else i for i in loaded.catalogue.items)
    return replace(loaded, catalogue=replace(loaded.catalogue, items=items))


def without_cost(loaded: LoadedData, *items: str) -> LoadedData:
    cost = loaded.base.cost.copy()
    cost[[at(loaded, item) for item in items]] = np.nan
    margin = loaded.base.net_price - cost
    return replace(loaded, base=replace(loaded.base, cost=cost, margin=margin))


def test_each_goal_counts_what_it_says(loaded: LoadedData, fitted: FittedModel) -> None:
    base = loaded.base
    np.testing.assert_array_equal(pose_problem(loaded, fitted, Limits()).problem.value, base.margin)
    sales = pose_problem(loaded, fitted, Limits(goal="sales"))
    np.testing.assert_array_equal(sales.problem.value, base.net_price)
    units = pose_problem(loaded, fitted, Limits(goal="units"))
    assert (units.problem.value == 1.0).all()
    assert (sales.goal, units.goal, units.notes) == ("sales", "units", ())
    with pytest.raises(CallError, match="glory"):
        goal_values(loaded, "glory")


def test_without_any_cost_the_goal_becomes_sales_aloud(loaded: LoadedData, fitted: FittedModel) -> None:
    posed = pose_problem(
        without_cost(loaded, *(i.code for i in loaded.catalogue.items)), fitted, Limits(goal="margin")
    )
    assert posed.goal == "sales"
    np.testing.assert_array_equal(posed.problem.value, loaded.base.net_price)
    assert "sales" in posed.notes[0]
    # Offers are not left out for a cost that nobody knows.
    assert not posed.problem.never[NORTH, at(loaded, "0090")]


def test_items_without_cost_are_named_and_count_nothing(loaded: LoadedData, fitted: FittedModel) -> None:
    posed = pose_problem(without_cost(loaded, "0012", "0031"), fitted, Limits())
    assert posed.goal == "margin"
    assert (posed.problem.value[:, [at(loaded, "0012"), at(loaded, "0031")]] == 0.0).all()
    assert "0012, 0031" in posed.notes[0]
    assert np.isfinite(posed.problem.value).all()


def test_offers_without_price_or_cost_are_left_out_aloud(loaded: LoadedData, fitted: FittedModel) -> None:
    posed = pose_problem(without_cost(loaded, "0090"), fitted, Limits())
    assert posed.problem.never[:, at(loaded, "0090")].all()
    assert "0090" in posed.notes[0]
    price = loaded.base.price.copy()
    price[:, at(loaded, "0090")] = 0.0
    unpriced = replace(loaded, base=replace(loaded.base, price=price))
    posed = pose_problem(unpriced, fitted, Limits(goal="sales"))
    assert posed.problem.never[:, at(loaded, "0090")].all()
    assert "without a price" in posed.notes[0]


def test_items_without_an_estimate_are_not_listed(loaded: LoadedData, fitted: FittedModel) -> None:
    attraction = fitted.estimate.attraction.copy()
    attraction[:, :, at(loaded, "0090")] = np.nan
    blank = replace(fitted, estimate=replace(fitted.estimate, attraction=attraction))
    posed = pose_problem(loaded, blank, Limits())
    assert posed.problem.never[:, at(loaded, "0090")].all()
    assert "cannot be estimated" in posed.notes[0]


def test_offers_stay_out_where_they_are_not_offered(loaded: LoadedData, fitted: FittedModel) -> None:
    problem = pose_problem(loaded, fitted, Limits()).problem
    j = at(loaded, "0090")
    assert (problem.never[NORTH, j], problem.never[SOUTH, j]) == (False, True)
    assert problem.never.sum() == 1


def test_the_catalogues_keep_flags_bind_where_the_item_is_listed(
    loaded: LoadedData, fitted: FittedModel
) -> None:
    # 0023 is on the list of South only.
    problem = pose_problem(with_item(loaded, "0023", keep=True), fitted, Limits()).problem
    j = at(loaded, "0023")
    assert (problem.keep[NORTH, j], problem.keep[SOUTH, j]) == (False, True)
    assert problem.keep.sum() == 1


def test_locks_by_kind_and_cluster(loaded: LoadedData, fitted: FittedModel) -> None:
    locks = (
        ItemLock("0012", "keep", "North"),
        ItemLock("0013", "never"),
        ItemLock("0022", "as today", "South"),
        ItemLock("0090", "keep"),
    )
    problem = pose_problem(loaded, fitted, Limits(locks=locks)).problem
    assert np.argwhere(problem.keep).tolist() == [
        [NORTH, at(loaded, "0012")],
        [NORTH, at(loaded, "0090")],
        [SOUTH, at(loaded, "0090")],
    ]
    assert problem.never[:, at(loaded, "0013")].all()
    assert np.argwhere(problem.locked).tolist() == [[SOUTH, at(loaded, "0022")]]


def test_limits_of_a_cluster(loaded: LoadedData, fitted: FittedModel) -> None:
    limits = Limits(
        max_changes=3,
        clusters=(ClusterLimit("South", space=90.0, min_items=4, max_items=8),),
        listing_cost=2.0,
        delisting_cost=1.0,
    )
    problem = pose_problem(loaded, fitted, limits).problem
    south = fitted.estimate.cluster == SOUTH
    assert (problem.space_limit[south] == 90.0).all()
    np.testing.assert_array_equal(problem.space_limit[~south], loaded.base.space_limit[~south])
    assert (problem.min_items[SOUTH], problem.max_items[SOUTH]) == (4.0, 8.0)
    assert (problem.min_items[NORTH], problem.max_items[NORTH]) == (0.0, len(loaded.catalogue.items))
    assert (problem.max_changes, problem.listing_cost, problem.delisting_cost) == (3, 2.0, 1.0)
    # A cluster's space only tightens what the stores have.
    wide = Limits(clusters=(ClusterLimit("South", space=1e6),))
    np.testing.assert_array_equal(
        pose_problem(loaded, fitted, wide).problem.space_limit, loaded.base.space_limit
    )


def test_items_that_a_plan_lists_again_are_named(loaded: LoadedData) -> None:
    cluster = np.array(loaded.catalogue.cluster_of_store())
    today = loaded.base.today.copy()
    today[:, at(loaded, "0032")] = False
    gone = replace(loaded, base=replace(loaded.base, today=today))
    states = today_states(today, cluster, 2)
    assert listed_again(gone, states) == ()
    states[NORTH, at(loaded, "0032")] = IN
    states[NORTH, at(loaded, "0090")] = IN
    (said,) = listed_again(gone, states)
    assert "0032" in said
    assert "0090" not in said
