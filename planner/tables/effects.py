"""Rows of a what-if: units of items or groups before and after, with intervals on common draws."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.transfer.what_if import WhatIf, interval

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class Effects:
    """One entry per group (N,): before, after, change with its 80 % interval, per week.

    share: change over what the changed items gain and lose themselves (0..1; NaN when nothing
    changed), with its 80 % interval.  moved: that amount.
    """

    before: Floats
    after: Floats
    change: Floats
    low: Floats
    high: Floats
    share: Floats
    share_low: Floats
    share_high: Floats
    moved: float


def changed_by_units(effects: WhatIf) -> Bools:
    """(C, J): items that sell on one side of the comparison only."""
    changed: Bools = (effects.before > 0.0) != (effects.after > 0.0)
    return changed


def effects_of(
    effects: WhatIf, changed: Bools, groups: Floats, clusters: Sequence[int], weight: Floats | None = None
) -> Effects:
    """Sum the what-if over ``clusters`` and the items of each group.

    changed (C, J): the items that were changed; groups (N, J): 1 for an item of the group;
    weight (C, J): what one unit counts for (content, money), None: 1.
    """
    picked = list(clusters)
    value = np.ones_like(effects.before) if weight is None else np.nan_to_num(weight)
    value = value[picked]

    def total(units: Floats) -> Floats:
        summed: Floats = (units[..., picked, :] * value).sum(axis=-2) @ groups.T
        return summed

    def moved(units: Floats) -> Floats:
        amount: Floats = np.abs(units[..., picked, :] * value * changed[picked]).sum(axis=(-2, -1))
        return amount

    step, steps = effects.after - effects.before, effects.draws_after - effects.draws_before
    change, draws = total(step), total(steps)
    low, high = interval(draws)
    amount, amounts = float(moved(step)), moved(steps)
    unknown = np.full_like(change, np.nan)
    share, share_low, share_high = unknown, unknown, unknown
    if amount > 0.0:
        share = change / amount
        valid = amounts > 0.0
        if valid.any():
            share_low, share_high = interval(draws[valid] / amounts[valid, None])
    return Effects(
        total(effects.before),
        total(effects.after),
        change,
        low,
        high,
        share,
        share_low,
        share_high,
        amount,
    )


def floats(values: Floats) -> tuple[float | None, ...]:
    """Python numbers for a table's column; None where not finite."""
    return tuple(float(v) if np.isfinite(v) else None for v in values)
