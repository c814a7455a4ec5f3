"""Runs of weeks in store x week x item cubes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]
Floats = NDArray[np.float64]


def weeks_back(marked: Bools, counted: Bools) -> Ints:
    """Counted weeks since the last marked one (S, W, J): 0 in a marked week, -1 before the first.

    counted (S, W) or (S, W, J): weeks that count (the store has data, the item its place).
    """
    steps = _cube(counted)
    result = np.full(marked.shape, -1, dtype=np.int64)
    since = np.full((marked.shape[0], marked.shape[2]), -1, dtype=np.int64)
    for w in range(marked.shape[1]):
        since = np.where(marked[:, w], 0, np.where(since >= 0, since + steps[:, w], -1))
        result[:, w] = since
    return result


def _cube(counted: Bools) -> Ints:
    cube: Ints = (counted if counted.ndim == 3 else counted[:, :, None]).astype(np.int64)
    return cube


def gaps(marked: Bools, counted: Bools) -> tuple[Ints, Bools, Bools]:
    """(length, has mark before, has mark after), each (S, W, J), of the gap a week lies in; 0 when marked.

    Lengths are in counted weeks.
    """
    back = weeks_back(marked, counted)
    ahead = weeks_back(marked[:, ::-1], counted[:, ::-1])[:, ::-1]
    opened = _cube(counted)
    total = np.cumsum(opened, axis=1)
    first, last = back < 0, ahead < 0
    # A gap at either end reaches to the store's first or last week with data.
    before = np.where(first, total, back)
    after = np.where(last, total[:, -1:, :] - total + opened, ahead)
    length = np.where(marked, 0, before + after - opened)
    return length, ~first, ~last


def carry(values: Floats, axis: int = 1) -> Floats:
    """Unknown (NaN) values take the last known one along ``axis``, then the next one."""
    result = np.moveaxis(values.copy(), axis, 0)
    for direction in (result, result[::-1]):
        for k in range(1, direction.shape[0]):
            direction[k] = np.where(np.isnan(direction[k]), direction[k - 1], direction[k])
    filled: Floats = np.moveaxis(result, 0, axis)
    return filled


def upper_median(values: Floats) -> Floats:
    """The upper median over axis 0 of the known (not NaN) values: one of them, NaN when none."""
    ordered = np.sort(values, axis=0)
    known = (~np.isnan(values)).sum(axis=0)
    picked: Floats = np.take_along_axis(ordered, (known // 2)[None].clip(max=values.shape[0] - 1), axis=0)[0]
    return np.where(known > 0, picked, np.nan)
