"""Which limits clash: an irreducible set by deletion (Chinneck & Dravnieks 1991), in words."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _
from planner.optimise.components import cluster_model
from planner.optimise.linear import LinearStatus, solve_binary
from planner.optimise.local_search import limit_rows
from planner.optimise.problem import AssortmentProblem

Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class _Group:
    """One limit that can be dropped: kind and where it binds (store, cluster or item)."""

    kind: str
    cluster: int
    index: int = -1


def feasible(problem: AssortmentProblem, seconds: float = 10.0) -> bool:
    """Some assortment meets every limit (a timeout counts as yes)."""
    matrices, lows, highs, uppers = [], [], [], []
    n_clusters = problem.value.shape[0]
    for c in range(n_clusters):
        model = cluster_model(problem, c)
        matrix, low, high = limit_rows(model, None)
        matrices.append(matrix)
        lows.append(low)
        highs.append(high)
        uppers.append(np.concatenate([model.allowed[:, 1], model.allowed[:, 2]]).astype(np.float64))
        if (~model.allowed.any(axis=1)).any():
            return False
    width = sum(m.shape[1] for m in matrices)
    total = np.zeros((sum(m.shape[0] for m in matrices) + 1, width))
    row = column = 0
    offset = 0.0
    for c, matrix in enumerate(matrices):
        total[row : row + matrix.shape[0], column : column + matrix.shape[1]] = matrix
        change, constant = _changes(problem, c)
        total[-1, column : column + matrix.shape[1]] = change
        offset += constant
        row, column = row + matrix.shape[0], column + matrix.shape[1]
    most = np.inf if problem.max_changes is None else problem.max_changes - offset
    low = np.concatenate([*lows, [-np.inf]])
    high = np.concatenate([*highs, [most]])
    if (np.concatenate(lows) > np.concatenate(highs) + 1e-9).any():
        return False
    answer = solve_binary(np.zeros(width), total, low, high, np.concatenate(uppers), seconds, 1.0)
    return answer.status is not LinearStatus.INFEASIBLE


def _changes(problem: AssortmentProblem, c: int) -> tuple[NDArray[np.float64], float]:
    """Number of changes as row over (IN, AS_TODAY) and constant."""
    today = cluster_model(problem, c).today
    into = np.where(today == 1, -1.0, np.where(today == 2, 0.0, 1.0))
    stay = np.where(today == 2, -1.0, 0.0)
    return np.concatenate([into, stay]), float((today != 0).sum())


def _groups(problem: AssortmentProblem) -> list[_Group]:
    groups = []
    for c in range(problem.value.shape[0]):
        for kind, values in (
            ("least", problem.min_items[c] > 0),
            ("most", problem.max_items[c] < problem.value.shape[1]),
        ):
            if values:
                groups.append(_Group(kind, c))
        for kind in ("keep", "never", "locked"):
            groups += [_Group(kind, c, int(j)) for j in np.flatnonzero(getattr(problem, kind)[c])]
    groups += [_Group("space", int(problem.demand.cluster[s]), s) for s in range(problem.space_limit.size)]
    if problem.max_changes is not None:
        groups.append(_Group("changes", -1))
    return groups


def _without(problem: AssortmentProblem, group: _Group) -> AssortmentProblem:
    """The problem with one limit dropped."""
    if group.kind == "changes":
        return replace(problem, max_changes=None)
    if group.kind == "space":
        limit = problem.space_limit.copy()
        limit[group.index] = 1e12
        return replace(problem, space_limit=limit)
    if group.kind in ("least", "most"):
        name = "min_items" if group.kind == "least" else "max_items"
        counts = getattr(problem, name).copy()
        counts[group.cluster] = 0.0 if group.kind == "least" else 1e9
        return replace(problem, **{name: counts})
    mask = getattr(problem, group.kind).copy()
    mask[group.cluster, group.index] = False
    return replace(problem, **{group.kind: mask})


def _words(problem: AssortmentProblem, left: list[_Group]) -> tuple[str, ...]:
    """The clashing limits as sentences; locks of a cluster are counted together."""
    said = []
    for kind, text in (
        ("keep", _("{n} items are kept in cluster {where} and need {space:.0f} of space")),
        ("never", _("{n} items are never to be listed in cluster {where}")),
        ("locked", _("{n} items stay as today in cluster {where}")),
    ):
        for c in range(problem.value.shape[0]):
            items = [group.index for group in left if group.kind == kind and group.cluster == c]
            if items:
                space = float(problem.space[items].sum())
                said.append(text.format(n=len(items), where=problem.cluster_name(c), space=space))
    for group in left:
        where = problem.cluster_name(group.cluster)
        if group.kind == "space":
            limit = float(problem.space_limit[group.index])
            said.append(
                _("store {store} of cluster {where} has {limit:.0f} of space").format(
                    store=problem.store_name(group.index), where=where, limit=limit
                )
            )
        elif group.kind == "least":
            said.append(
                _("cluster {where} needs at least {n:.0f} items").format(
                    where=where, n=problem.min_items[group.cluster]
                )
            )
        elif group.kind == "most":
            said.append(
                _("cluster {where} takes at most {n:.0f} items").format(
                    where=where, n=problem.max_items[group.cluster]
                )
            )
        elif group.kind == "changes":
            said.append(_("at most {n} changes").format(n=problem.max_changes))
    return tuple(said)


def clashing_limits(problem: AssortmentProblem) -> tuple[str, ...]:
    """An irreducible set of limits that no assortment meets together.

    First whole kinds are dropped, then single limits; a limit whose test times out stays.
    """
    left = _groups(problem)
    current = problem
    for kind in ("space", "never", "keep", "locked", "most", "least"):
        trial = current
        for group in [g for g in left if g.kind == kind]:
            trial = _without(trial, group)
        if not feasible(trial):
            current = trial
            left = [g for g in left if g.kind != kind]
    for group in list(left):
        trial = _without(current, group)
        if not feasible(trial):
            current = trial
            left.remove(group)
    return _words(problem, left)
