"""Recomputes a plan's value and limits from raw arrays, sharing nothing with the optimiser.

States: 0 out of all stores of the cluster, 1 in all, 2 as today.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class RawProblem:
    """The assortment problem's numbers: see the fields of the same name in the problem record.

    attraction (C, J), dissimilarity (G,), category_dissimilarity, scale (S,), segment (J,),
    cluster (S,), shoppers (S,) or None, today (S, J), value (C, J), space (J,), space_limit (S,),
    min_items, max_items (C,), keep, never, locked (C, J), max_changes, listing_cost, delisting_cost.
    """

    attraction: Floats
    dissimilarity: Floats
    category_dissimilarity: float
    scale: Floats
    segment: Ints
    cluster: Ints
    shoppers: Floats | None
    today: Bools
    value: Floats
    space: Floats
    space_limit: Floats
    min_items: Floats
    max_items: Floats
    keep: Bools
    never: Bools
    locked: Bools
    max_changes: int | None
    listing_cost: float
    delisting_cost: float


def state_today(raw: RawProblem, c: int, j: int) -> int:
    """Today's state of item j in cluster c."""
    inside = [bool(raw.today[s, j]) for s in range(raw.cluster.size) if raw.cluster[s] == c]
    return 1 if all(inside) else (2 if any(inside) else 0)


def _shelf(raw: RawProblem, states: NDArray[np.int8], s: int) -> list[int]:
    c = int(raw.cluster[s])
    return [
        j
        for j in range(raw.segment.size)
        if states[c, j] == 1 or (states[c, j] == 2 and bool(raw.today[s, j]))
    ]


def store_value(raw: RawProblem, states: NDArray[np.int8], s: int) -> float:
    """Money (or units) of one store: nested demand written out item by item."""
    c = int(raw.cluster[s])
    shelf = _shelf(raw, states, s)
    totals: dict[int, float] = {}
    for j in shelf:
        g = int(raw.segment[j])
        totals[g] = totals.get(g, 0.0) + float(raw.attraction[c, j])
    lambda_c = raw.category_dissimilarity
    levels = {g: total ** (float(raw.dissimilarity[g]) / lambda_c) for g, total in totals.items()}
    inclusive = math.fsum(levels.values())
    if inclusive <= 0.0:
        return 0.0
    category = float(raw.scale[s]) * inclusive**lambda_c
    if raw.shoppers is not None:
        category = float(raw.shoppers[s]) * category / (1.0 + category)
    return math.fsum(
        category
        * (levels[int(raw.segment[j])] / inclusive)
        * (float(raw.attraction[c, j]) / totals[int(raw.segment[j])])
        * float(raw.value[c, j])
        for j in shelf
    )


def plan_value(raw: RawProblem, states: NDArray[np.int8]) -> float:
    """Sum over all stores, less the cost of the changes."""
    money = math.fsum(store_value(raw, states, s) for s in range(raw.cluster.size))
    cost = 0.0
    for c in range(states.shape[0]):
        for j in range(states.shape[1]):
            if states[c, j] != state_today(raw, c, j):
                cost += raw.listing_cost if states[c, j] == 1 else raw.delisting_cost
    return money - cost


def broken_limits(raw: RawProblem, states: NDArray[np.int8], slack: float = 1e-6) -> tuple[str, ...]:
    """Every limit the plan breaks, in words; empty when it meets all."""
    broken = []
    changes = 0
    for c in range(states.shape[0]):
        count = 0
        for j in range(states.shape[1]):
            state, now = int(states[c, j]), state_today(raw, c, j)
            changes += state != now
            count += state != 0
            where = f"item {j} in cluster {c}"
            if state == 2 and now != 2:
                broken.append(f"{where} is as today but not partly listed")
            if raw.keep[c, j] and state == 0:
                broken.append(f"{where} is kept but out")
            if raw.never[c, j] and state != 0:
                broken.append(f"{where} is never to be listed but in")
            if raw.locked[c, j] and state != now:
                broken.append(f"{where} is locked but changed")
        if not raw.min_items[c] <= count <= raw.max_items[c]:
            broken.append(f"cluster {c} has {count} items")
    for s in range(raw.cluster.size):
        used = math.fsum(float(raw.space[j]) for j in _shelf(raw, states, s))
        if used > float(raw.space_limit[s]) + slack:
            broken.append(f"store {s} needs {used} of {raw.space_limit[s]} space")
    if raw.max_changes is not None and changes > raw.max_changes:
        broken.append(f"{changes} changes of at most {raw.max_changes}")
    return tuple(broken)
