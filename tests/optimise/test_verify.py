"""The verifier on its own: it sees every broken limit and recomputes the value."""

import dataclasses

import numpy as np
import pytest

from planner.base.errors import RangewrightError
from planner.optimise import solve
from planner.optimise.problem import SolverSettings, Status
from planner.optimise.verify import broken_limits, plan_value
from planner.transfer.what_if import presence
from tests.optimise.cases import random_case


def answered(seed: int):
    problem = random_case(seed)
    found = solve.best_assortment(problem, SolverSettings(seconds=20.0, gap=1e-8, starts=2))
    return problem, found


POSSIBLE = [seed for seed in range(25) if answered(seed)[1].status is not Status.IMPOSSIBLE]


@pytest.mark.parametrize("seed", POSSIBLE[:8])
def test_value_is_the_sum_over_stores(seed):
    problem, found = answered(seed)
    present = presence(found.states, problem.today, problem.demand.cluster)
    units = problem.demand.units(present)[0]
    money = float((units * problem.value[problem.demand.cluster]).sum())
    raw = dataclasses.replace(solve.raw_problem(problem), listing_cost=0.0, delisting_cost=0.0)
    assert plan_value(raw, found.states) == pytest.approx(money, rel=1e-10, abs=1e-9)


@pytest.mark.parametrize("seed", POSSIBLE[:8])
def test_every_kind_of_broken_limit_is_seen(seed):
    problem, found = answered(seed)
    raw = solve.raw_problem(problem)
    assert broken_limits(raw, found.states) == ()
    listed = np.argwhere(found.states != 0)
    out = np.argwhere(found.states == 0)
    if len(listed):
        never = np.zeros_like(raw.never)
        never[tuple(listed[0])] = True
        assert any("never" in w for w in broken_limits(dataclasses.replace(raw, never=never), found.states))
        tight = np.full_like(raw.space_limit, 1e-3)
        said = broken_limits(dataclasses.replace(raw, space_limit=tight), found.states)
        assert any("space" in w for w in said)
    if len(out):
        keep = np.zeros_like(raw.keep)
        keep[tuple(out[0])] = True
        assert any("kept" in w for w in broken_limits(dataclasses.replace(raw, keep=keep), found.states))
    counts = dataclasses.replace(raw, min_items=np.full_like(raw.min_items, 50.0))
    assert any("items" in w for w in broken_limits(counts, found.states))
    assert any("changes" in w for w in broken_limits(dataclasses.replace(raw, max_changes=-1), found.states))


def test_a_wrong_value_stops_the_answer(monkeypatch):
    monkeypatch.setattr(solve, "plan_value", lambda raw, states: plan_value(raw, states) * 1.001 + 1.0)
    with pytest.raises(RangewrightError, match="failed its check"):
        answered(POSSIBLE[0])
