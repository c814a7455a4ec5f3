"""Rules that need no fitted model, for comparison with it."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


def proportional(units: Floats, shoppers: float | None, removed: Bools) -> Floats:
    """Transfer shares (J + 1,) when lost sales spread in proportion to what the others sell.

    units (J,) per week; removed (J,): the items that go; the last entry leaves the category.
    With shoppers, those who bought nothing are one more alternative (the plain logit's
    rule, McFadden 1974); without, nobody leaves.
    """
    staying = np.where(removed, 0.0, units)
    outside = 0.0 if shoppers is None else max(shoppers - float(units.sum()), 0.0)
    shares = np.append(staying, outside)
    total = shares.sum()
    return shares / total if total > 0.0 else np.append(np.zeros_like(units), 1.0)


def proportional_in_segment(units: Floats, segment: NDArray[np.int64], removed: int) -> Floats:
    """As ``proportional`` without shoppers, among the items of the removed item's segment only."""
    staying = np.where(segment == segment[removed], units, 0.0)
    staying[removed] = 0.0
    total = staying.sum()
    if total <= 0.0:
        return np.append(np.zeros_like(units), 1.0)
    return np.append(staying / total, 0.0)


def transfer_error(estimated: Floats, true: Floats, volume: Floats) -> float:
    """Volume-weighted error of transfers: half the sum of absolute differences of shares.

    estimated, true (n, J + 1): one delisting per row, no purchase included;
    volume (n,): units of the delisted items.
    """
    misplaced = 0.5 * np.abs(estimated - true).sum(axis=1)
    return float((misplaced * volume).sum() / volume.sum())
