"""Item effects predicted from attributes: where thin items shrink to and what a new item gets."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.catalogue.items import Catalogue
from planner.sales.panel import BaseWeek

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class AttributePrediction:
    """centre (J,): predicted mean scaled effect; spread: standard deviation of what it misses."""

    centre: Floats
    spread: float


def _categories(values: list[str]) -> Floats:
    """0/1 columns (J, n) of a text attribute, one per value seen twice or more."""
    names, counts = np.unique(values, return_counts=True)
    kept = [str(name) for name, count in zip(names, counts, strict=True) if name and count > 1]
    table = np.array([[float(value == name) for name in kept] for value in values])
    columns: Floats = table.reshape(len(values), len(kept))
    return columns


def _numbers(values: Floats) -> Floats:
    """Standardised column (J, 1); unknown values become the mean."""
    known = np.isfinite(values)
    if known.sum() < 3 or np.std(values[known]) < 1e-9:
        return np.zeros((values.size, 0))
    centred = np.where(known, values - values[known].mean(), 0.0) / np.std(values[known])
    column: Floats = centred[:, None]
    return column


def features(catalogue: Catalogue, base: BaseWeek, distribution: Floats) -> tuple[Floats, int]:
    """Columns (J, F) and how many of them, the segments, stand first.

    Segment, own label, brand, ln price and ln content (within the segment), the share of
    stores that carry the item (offers: their segment's mean), and further text columns.
    """
    items = catalogue.items
    segment = np.array(catalogue.segment_of_item())
    segments = (segment[:, None] == np.arange(len(catalogue.segments))).astype(np.float64)
    inside = segments / np.maximum(segments.sum(axis=0), 1.0)

    def within(values: Floats) -> Floats:
        known = np.where(
            np.isfinite(values), values, np.nanmean(values) if np.isfinite(values).any() else 0.0
        )
        centred: Floats = known - (inside.T @ known)[segment]
        return centred

    with np.errstate(divide="ignore", invalid="ignore"):
        price = np.log(base.price.mean(axis=0))
        content = np.log(np.array([item.content for item in items]))
    price = np.where(np.isfinite(price), price, np.nan)
    content = np.where(np.isfinite(content), content, np.nan)
    offer = np.array([item.is_offer for item in items])
    carried = np.where(offer, np.nan, distribution)
    columns = [segments, np.array([[float(item.own_label)] for item in items])]
    columns.append(_categories([item.brand for item in items]))
    columns += [_numbers(within(values)) for values in (price, content, carried)]
    texts = sorted({name for item in items for name, value in item.attributes if isinstance(value, str)})
    for name in texts:
        values = [str(dict(item.attributes).get(name, "")) for item in items]
        # A column with nearly as many values as items is a name, not an attribute.
        if len(set(values)) <= max(2, len(items) // 4):
            columns.append(_categories(values))
    return np.concatenate(columns, axis=1), len(catalogue.segments)


def predict(effects: Floats, precision: Floats, columns: Floats, n_segments: int) -> AttributePrediction:
    """Ridge regression of item effects (J,) on their attributes (Nevo 2001, second stage).

    precision (J,): 1 / squared standard error, 0 for items without sales (predicted only).
    Segment columns are free, the others shrink; the ridge is chosen by generalised
    cross-validation (Golub, Heath & Wahba 1979).
    """
    known = precision > 0.0
    weight = precision[known] / (1.0 + precision[known])
    x, y = columns[known], effects[known]
    root = np.sqrt(weight)[:, None]
    best: tuple[float, Floats, float] | None = None
    for ridge in np.geomspace(0.3, 300.0, 16):
        penalty = np.full(columns.shape[1], ridge)
        penalty[:n_segments] = 1e-3
        gram = (x * weight[:, None]).T @ x + np.diag(penalty)
        solve = np.linalg.solve(gram, (x * weight[:, None]).T)
        used = float(np.trace((x * root).T @ (x * root) @ np.linalg.inv(gram)))
        missed = y - x @ (solve @ y)
        squares = float((weight * missed**2).sum() / weight.sum())
        score = squares / max(1.0 - used / weight.size, 0.05) ** 2
        if best is None or score < best[0]:
            spread = np.sqrt(squares / max(1.0 - used / weight.size, 0.05))
            best = (score, columns @ (solve @ y), float(spread))
    assert best is not None
    return AttributePrediction(best[1], max(best[2], 0.1))
