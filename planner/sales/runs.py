"""Runs, windows and medians in store x week x item cubes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]
Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Gaps:
    """The gap that each week (S, W, J) lies in.

    length: counted weeks, 0 in a marked week.  before, after: there is a marked week on that side.
    """

    length: NDArray[np.int32]
    before: Bools
    after: Bools


def gaps(marked: Bools, counted: Bools) -> Gaps:
    """Gaps between marked weeks; counted (S, W): weeks that count (the store has data).

    A gap at either end reaches to the store's first or last counted week.
    """
    passed = np.cumsum(counted, axis=1, dtype=np.int32)[:, :, None]
    total = passed[:, -1:]
    last = np.maximum.accumulate(np.where(marked, passed, np.int32(0)), axis=1)
    ahead = np.where(marked, passed, total + 1)[:, ::-1]
    coming = np.minimum.accumulate(ahead, axis=1)[:, ::-1]
    length = np.where(marked, np.int32(0), coming - last - 1)
    return Gaps(length, last > 0, coming <= total)


def window_sum(values: Floats, weeks: int) -> Floats:
    """Sum over the week itself and the ``weeks - 1`` before it, along axis 0."""
    running = np.cumsum(values, axis=0)
    result = running.copy()
    result[weeks:] -= running[:-weeks]
    return result


def fill_forward(values: Floats, axis: int = 0) -> Floats:
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
