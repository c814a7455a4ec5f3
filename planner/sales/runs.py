"""Runs, windows and medians in store x week x item cubes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]
Floats = NDArray[np.float64]


def weeks_back(marked: Bools, counted: Bools) -> Ints:
    """Counted weeks since the last marked one (S, W, J): 0 in a marked week, -1 before the first.

    counted (S, W): weeks that count (the store has data).
    """
    passed = np.cumsum(counted, axis=1, dtype=np.int64)[:, :, None]
    last = np.maximum.accumulate(np.where(marked, passed, -1), axis=1)
    result: Ints = np.where(last >= 0, passed - last, -1)
    return result


def gaps(marked: Bools, counted: Bools) -> tuple[Ints, Bools, Bools]:
    """(length, has mark before, has mark after), each (S, W, J), of the gap a week lies in; 0 when marked.

    Lengths are in counted weeks.
    """
    back = weeks_back(marked, counted)
    ahead = weeks_back(marked[:, ::-1], counted[:, ::-1])[:, ::-1]
    opened = counted[:, :, None].astype(np.int64)
    total = np.cumsum(opened, axis=1)
    first, last = back < 0, ahead < 0
    # A gap at either end reaches to the store's first or last week with data.
    before = np.where(first, total, back)
    after = np.where(last, total[:, -1:, :] - total + opened, ahead)
    length = np.where(marked, 0, before + after - opened)
    return length, ~first, ~last


def window_sum(values: Floats, weeks: int) -> Floats:
    """Sum over the week itself and the ``weeks - 1`` before it, along axis 1."""
    running = np.cumsum(values, axis=1)
    result = running.copy()
    result[:, weeks:] -= running[:, :-weeks]
    return result


def fill_forward(values: Floats, axis: int = 1) -> Floats:
    """Unknown (NaN) values take the last known one along ``axis``."""
    moved = np.moveaxis(values, axis, 0)
    place = np.arange(moved.shape[0]).reshape(-1, *[1] * (moved.ndim - 1))
    last = np.maximum.accumulate(np.where(np.isnan(moved), -1, place), axis=0)
    filled = np.take_along_axis(moved, np.maximum(last, 0), axis=0)
    result: Floats = np.moveaxis(filled, 0, axis)
    return result


def carry(values: Floats, axis: int = 1) -> Floats:
    """Unknown (NaN) values take the last known one along ``axis``, then the next one."""
    ahead = fill_forward(values, axis)
    result: Floats = np.flip(fill_forward(np.flip(ahead, axis), axis), axis)
    return result


def upper_median(values: Floats) -> Floats:
    """The upper median over axis 0 of the known (not NaN) values: one of them, NaN when none."""
    ordered = np.sort(values, axis=0)
    known = (~np.isnan(values)).sum(axis=0)
    place = np.minimum(known // 2, values.shape[0] - 1)
    picked = np.take_along_axis(ordered, place[None], axis=0)[0]
    return np.where(known > 0, picked, np.nan)
