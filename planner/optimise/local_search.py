"""Local search in one cluster: change one item's state, or two at once; best improvement."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.optimise.components import ClusterModel, nest
from planner.optimise.linear import LinearStatus, solve_binary
from planner.optimise.problem import AS_TODAY, IN, OUT, States

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class _Moves:
    """M single moves from a plan: item, new state, and what each adds.

    total, money (M, R): to D and to sum of v m of the item's segment; use (M, Q); count, changes,
    cost (M,).
    """

    item: Ints
    state: Ints
    total: Floats
    money: Floats
    use: Floats
    count: Floats
    changes: Floats
    cost: Floats


def _moves(model: ClusterModel, states: States) -> _Moves:
    allowed = model.allowed.copy()
    allowed[np.arange(states.size), states] = False
    item, state = np.nonzero(allowed)
    before = states[item]
    carries = model.carries[:, item].T.astype(np.float64)

    def shelf(of: States | Ints) -> Floats:
        there = (of == IN)[:, None] + (of == AS_TODAY)[:, None] * carries
        return np.asarray(there, dtype=np.float64)

    def use(of: States | Ints) -> Floats:
        taken = (of == IN)[:, None] * model.space[item][:, None]
        return np.asarray(taken + (of == AS_TODAY)[:, None] * model.uses[:, item].T, dtype=np.float64)

    step = shelf(state) - shelf(before)
    v = model.attraction[item][:, None]
    today = model.today[item]
    return _Moves(
        item,
        state,
        step * v,
        step * v * model.value[item][:, None],
        use(state) - use(before),
        (state != OUT).astype(np.float64) - (before != OUT),
        (state != today).astype(np.float64) - (before != today),
        model.costs[item, state] - model.costs[item, before],
    )


def _pair_worth(
    model: ClusterModel, moves: _Moves, first: Ints, second: Ints, total: Floats, money: Floats
) -> Floats:
    """Value before costs (n,) after moves first and second (second = -1: none), from D, N (R, G)."""
    lone = second < 0
    partner = np.where(lone, first, second)
    segment = model.segment[moves.item]
    level, weighted = nest(total, money, model.ratio)
    inclusive, phi = level.sum(axis=1), weighted.sum(axis=1)
    g, h = segment[first], segment[partner]
    same = (g == h) & ~lone
    to_total = moves.total[first] + np.where(same[:, None], moves.total[partner], 0.0)
    to_money = moves.money[first] + np.where(same[:, None], moves.money[partner], 0.0)

    def replaced(which: Ints, more: Floats, richer: Floats) -> tuple[Floats, Floats]:
        old = total[:, which].T
        new = old + more
        # What is left after the last item went is rounding, not an item.
        new = np.where(new > 1e-9 * np.maximum(old, 1e-300), new, 0.0)
        w, f = nest(new, money[:, which].T + richer, model.ratio[which][:, None])
        return w - level[:, which].T, f - weighted[:, which].T

    by_first = replaced(g, to_total, to_money)
    apart = np.flatnonzero(~same & ~lone)
    new_w, new_phi = inclusive + by_first[0], phi + by_first[1]
    if apart.size:
        more = replaced(h[apart], moves.total[partner[apart]], moves.money[partner[apart]])
        new_w[apart] += more[0]
        new_phi[apart] += more[1]
    new_w = np.where(new_w > 1e-12 * np.maximum(inclusive, 1e-300), new_w, 0.0)
    worth: Floats = model.revenue(new_w, new_phi).sum(axis=1)
    return worth


def improve(
    model: ClusterModel, states: States, changes: int | None, rounds: int = 200
) -> tuple[float, States]:
    """Climb from a feasible plan to one that no change of one or two items betters."""
    members = (model.segment[:, None] == np.arange(model.ratio.size)).astype(np.float64)
    value = float(model.objective(states))
    for _round in range(rounds):
        moves = _moves(model, states)
        present = model.presence(states).astype(np.float64) * model.attraction
        total, money = present @ members, (present * model.value) @ members
        n = moves.item.size
        first, second = np.triu_indices(n, 1)
        apart = moves.item[first] != moves.item[second]
        first = np.concatenate([np.arange(n), first[apart]])
        second = np.concatenate([np.full(n, -1), second[apart]])

        def summed(values: Floats, a: Ints = first, b: Ints = second) -> Floats:
            extra = np.where((b >= 0).reshape(-1, *[1] * (values.ndim - 1)), values[b], 0.0)
            return np.asarray(values[a] + extra, dtype=np.float64)

        count = float((states != OUT).sum()) + summed(moves.count)
        good = (model.use_of(states) + summed(moves.use) <= model.room + 1e-9 * (1.0 + model.room)).all(
            axis=1
        )
        good &= (count >= model.least) & (count <= model.most)
        if changes is not None:
            good &= float(model.changes_of(states)) + summed(moves.changes) <= changes
        keep = np.flatnonzero(good)
        if not keep.size:
            break
        first, second = first[keep], second[keep]
        worth = _pair_worth(model, moves, first, second, total, money)
        worth -= float(model.cost_of(states)) + summed(moves.cost, first, second)
        best = int(worth.argmax())
        if worth[best] <= value + 1e-10 * max(1.0, abs(value)):
            break
        trial = states.copy()
        trial[moves.item[first[best]]] = moves.state[first[best]]
        if second[best] >= 0:
            trial[moves.item[second[best]]] = moves.state[second[best]]
        exact = float(model.objective(trial))
        if exact <= value:
            break
        value, states = exact, trial
    return value, states


def feasible_plan(
    model: ClusterModel, wish: Floats, changes: int | None, seconds: float = 5.0
) -> States | None:
    """A plan that meets every limit, near the wish (J,) for IN; None when there is none."""
    n = model.today.size
    cost = np.concatenate([wish, np.where(model.allowed[:, AS_TODAY], 0.7 * wish, 0.0)])
    upper = np.concatenate([model.allowed[:, IN], model.allowed[:, AS_TODAY]]).astype(np.float64)
    matrix, low, high = limit_rows(model, changes)
    answer = solve_binary(cost, matrix, low, high, upper, seconds, 0.05)
    if answer.status is not LinearStatus.OPTIMAL:
        return None
    x = answer.x > 0.5
    return np.where(x[:n], IN, np.where(x[n:], AS_TODAY, OUT)).astype(np.int8)


def limit_rows(model: ClusterModel, changes: int | None) -> tuple[Floats, Floats, Floats]:
    """All limits of the cluster over (IN, AS_TODAY) per item: matrix, lower, upper."""
    n, q = model.today.size, model.room.size
    eye = np.eye(n)
    rows = [np.hstack([eye, eye])]
    must = ~model.allowed[:, OUT]
    low, high = [must.astype(np.float64)], [np.ones(n)]
    rows.append(np.hstack([np.tile(model.space, (q, 1)), model.uses]))
    low.append(np.full(q, -np.inf))
    high.append(model.room)
    rows.append(np.ones((1, 2 * n)))
    low.append(np.array([model.least]))
    high.append(np.array([model.most]))
    if changes is not None:
        into = np.where(model.today == IN, -1.0, 1.0)
        into = np.where(model.today == AS_TODAY, 0.0, into)
        stay = np.where(model.today == AS_TODAY, -1.0, 0.0)
        rows.append(np.concatenate([into, stay])[None])
        low.append(np.array([-np.inf]))
        high.append(np.array([changes - float((model.today != OUT).sum())]))
    return np.vstack(rows), np.concatenate(low), np.concatenate(high)
