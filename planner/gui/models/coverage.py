"""In how many stores each item was listed, week by week."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.catalogue.items import Catalogue
from planner.gui.theme import numbers


class Coverage(NamedTuple):
    """parts (rows, W): share of the stores with data that list the item; rows and weeks named."""

    parts: NDArray[np.float64]
    rows: tuple[str, ...]
    weeks: tuple[str, ...]


def coverage(
    catalogue: Catalogue,
    weeks: tuple[object, ...],
    week_index: NDArray[np.int64],
    listed: NDArray[np.bool_],
) -> Coverage:
    """One row per item ever listed, by segment and then first week; listed (T, J)."""
    n_weeks = len(weeks)
    counts = np.zeros((n_weeks, listed.shape[1]))
    np.add.at(counts, week_index, listed.astype(np.float64))
    stores = np.bincount(week_index, minlength=n_weeks).astype(np.float64)
    parts = (counts / np.where(stores > 0.0, stores, np.nan)[:, None]).T
    ever = np.flatnonzero((counts > 0.0).any(axis=0))
    first = (counts > 0.0).argmax(axis=0)
    items = catalogue.items
    order = sorted(ever, key=lambda j: (items[j].segment, first[j], -float(counts[:, j].sum())))
    names = tuple(items[j].description or items[j].code for j in order)
    return Coverage(parts[order], names, tuple(numbers.day(week) for week in weeks))  # type: ignore[arg-type]
