"""200 random small cases against enumeration: right values, valid bounds, impossible cases named."""

import dataclasses

import numpy as np
import pytest

import planner.optimise.cluster_search as cluster_search
import planner.optimise.relaxation as relaxation
import planner.optimise.solve as solve
from planner.optimise.problem import AssortmentProblem, AssortmentResult, SolverSettings, Status
from planner.optimise.solve import best_assortment
from tests.optimise.cases import enumerate_case, random_case

SETTINGS = SolverSettings(seconds=60.0, gap=1e-8, starts=2)


def complaints(problem: AssortmentProblem, found: AssortmentResult) -> list[str]:
    """What enumeration says against an answer."""
    best = enumerate_case(problem)
    if best is None:
        ok = found.status is Status.IMPOSSIBLE and bool(found.clashing)
        return [] if ok else [f"impossible, but answered {found.status}"]
    if found.status is Status.IMPOSSIBLE:
        return [f"said impossible, but {best} is possible"]
    size = max(1.0, abs(best))
    said = []
    if abs(found.value - best) > 1e-7 * size:
        said.append(f"value {found.value} instead of {best}")
    if found.bound < best - 1e-9 * size:
        said.append(f"false bound {found.bound} below {best}")
    for rung in found.rungs:
        true = enumerate_case(problem, rung.changes)
        if true is None or rung.value > true + 1e-7 * size or rung.bound < true - 1e-9 * size:
            said.append(f"rung {rung.changes}: {rung.value} to {rung.bound}, true {true}")
    return said


@pytest.mark.parametrize("first", range(0, 100, 20))
def test_small_cases_equal_enumeration(first):
    for seed in range(first, first + 20):
        problem = random_case(seed)
        found = best_assortment(problem, SETTINGS)
        assert complaints(problem, found) == [], seed
        if found.status is not Status.IMPOSSIBLE:
            assert found.gap <= 1e-7


def bare(monkeypatch) -> None:
    """No listing of whole plans and no local search: cuts and branching alone must find the best."""
    monkeypatch.setattr(cluster_search, "_FEW_PLANS", 2)
    for module in (cluster_search, solve):
        monkeypatch.setattr(
            module, "improve", lambda model, states, changes: (float(model.objective(states)), states)
        )


@pytest.mark.parametrize("first", range(100, 200, 20))
def test_small_cases_through_the_relaxation_equal_enumeration(first, monkeypatch):
    bare(monkeypatch)
    for seed in range(first, first + 20):
        problem = random_case(seed)
        assert complaints(problem, best_assortment(problem, SETTINGS)) == [], seed


def _planted(monkeypatch) -> int:
    """How many of 30 cases enumeration objects to."""
    bare(monkeypatch)
    count = 0
    for seed in range(30):
        problem = random_case(seed)
        count += bool(complaints(problem, best_assortment(problem, SETTINGS)))
    return count


def test_a_planted_wrong_cut_is_found_out(monkeypatch):
    """Overestimates of R that are 3 % too low must turn the comparison red."""
    honest = relaxation._cut_rows

    def wrong(model, box, centre, top):
        rows = honest(model, box, centre, top)
        n = model.n_components
        rows.matrix = [
            np.concatenate([row[: 3 * n], 1.03 * row[3 * n :]]) if row[3 * n :].any() else row
            for row in rows.matrix
        ]
        return rows

    monkeypatch.setattr(relaxation, "_cut_rows", wrong)
    assert _planted(monkeypatch) > 0


def test_a_planted_wrong_tangent_is_found_out(monkeypatch):
    """The chord of k used on the wrong side (below k) must turn the comparison red."""
    honest = relaxation._k_lines

    def wrong(model, r, wl, wh, k_low, k_high, t, centre):
        return [(a * 0.9, b) for a, b in honest(model, r, wl, wh, k_low, k_high, abs(t), centre)]

    monkeypatch.setattr(relaxation, "_k_lines", wrong)
    assert _planted(monkeypatch) > 0


def test_the_same_problem_gives_the_same_answer():
    for seed in (3, 17, 44):
        one, two = (best_assortment(random_case(seed), SETTINGS) for _ in range(2))
        assert one.status == two.status
        if one.states is not None:
            np.testing.assert_array_equal(one.states, two.states)
            assert one.value == two.value


class _StopAtOnce:
    def report(self, step, fraction=None):
        pass

    def improved(self, answer):
        pass

    def cancelled(self):
        return True


def test_stopping_keeps_the_best_with_an_honest_bound():
    for seed in range(40):
        problem = random_case(seed)
        best = enumerate_case(problem)
        if best is None:
            continue
        found = best_assortment(problem, SETTINGS, _StopAtOnce())
        assert found.value <= best + 1e-7 * max(1.0, abs(best))
        assert found.bound >= best - 1e-9 * max(1.0, abs(best))
        if found.gap > SETTINGS.gap:
            assert found.status is Status.STOPPED_EARLY


def test_segments_too_large_to_list_still_get_a_valid_bound(monkeypatch):
    monkeypatch.setattr(cluster_search, "MOST_COMBINATIONS", 1)
    for seed in range(12):
        problem = random_case(seed)
        best = enumerate_case(problem)
        if best is None:
            continue
        found = best_assortment(problem, dataclasses.replace(SETTINGS, seconds=2.0))
        assert found.bound >= best - 1e-9 * max(1.0, abs(best))
        assert found.value <= best + 1e-7 * max(1.0, abs(best))


def test_clashing_limits_are_irreducible_words():
    problem = random_case(0)
    n_clusters, n_items = problem.value.shape
    none = np.zeros((n_clusters, n_items), dtype=bool)
    keep = none.copy()
    keep[0, :3] = True
    clash = dataclasses.replace(
        problem,
        keep=keep,
        never=none,
        locked=none,
        space=np.ones(n_items),
        space_limit=np.full(problem.space_limit.size, 2.0),
        min_items=np.zeros(n_clusters),
        max_items=np.full(n_clusters, 99.0),
        max_changes=None,
        cluster_names=tuple(f"cluster {c}" for c in range(n_clusters)),
    )
    found = best_assortment(clash, SETTINGS)
    assert found.status is Status.IMPOSSIBLE
    assert len(found.clashing) == 2
    assert any("3 items are kept" in words and "cluster 0" in words for words in found.clashing)
    assert any("has 2 of space" in words for words in found.clashing)
