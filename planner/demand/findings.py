"""What a fit says in numbers a user may ask for: common parameters and how closed segments are."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit

from planner.catalogue.items import Catalogue
from planner.demand.estimation import Estimation
from planner.demand.fitted import Parameter, SegmentFinding
from planner.sales.panel import MarketPanel, dense

Floats = NDArray[np.float64]


def common_parameters(done: Estimation, spread: Floats, catalogue: Catalogue) -> tuple[Parameter, ...]:
    """Covariate effects, lambda_g / lambda_c per segment and lambda_c, with standard errors."""
    lay, theta = done.design.layout, done.maximum.theta
    errors = np.sqrt(np.maximum(np.diag(spread), 0.0))
    found = [
        Parameter(name, group, float(theta[k]), float(errors[k]))
        for k, (name, group) in enumerate(
            zip(done.design.names, done.design.groups, strict=True), start=lay.covariates.start
        )
    ]
    for g, name in enumerate(catalogue.segments):
        k = lay.ratio.start + g
        if done.free[k]:
            value = float(expit(theta[k]))
            error = float(errors[k]) * value * (1.0 - value)
            found.append(Parameter(f"dissimilarity ratio, {name}", "dissimilarity", value, error))
    k = lay.category_ratio.start
    if done.free[k]:
        value = float(expit(theta[k]))
        found.append(
            Parameter(
                "category dissimilarity", "dissimilarity", value, float(errors[k]) * value * (1.0 - value)
            )
        )
    return tuple(found)


def _listing_changes(panel: MarketPanel, n_stores: int) -> NDArray[np.int64]:
    """Number of listings and delistings (J,) in single stores inside the history."""
    listed = dense(panel, panel.listed, n_stores, np.nan)
    step = np.diff(listed, axis=1)
    changes: NDArray[np.int64] = (np.abs(np.nan_to_num(step)) > 0.5).sum(axis=(0, 1))
    return changes


def _two_way_spread(values: Floats, store: NDArray[np.int64], week: NDArray[np.int64]) -> float:
    """Standard deviation left after store and week means (alternating projections)."""
    left = values - values.mean()
    for _round in range(20):
        for group in (store, week):
            count = np.maximum(np.bincount(group), 1)
            left = left - (np.bincount(group, left) / count)[group]
    return float(left.std())


def segment_findings(
    done: Estimation, spread: Floats, sample: Floats, panel: MarketPanel, catalogue: Catalogue
) -> tuple[SegmentFinding, ...]:
    """Closure of every segment and what identifies it."""
    lay, theta, design = done.design.layout, done.maximum.theta, done.design
    ratio, category = expit(theta[lay.ratio]), float(expit(theta[lay.category_ratio])[0])
    drawn = expit(sample[:, lay.ratio])
    low, high = np.quantile(drawn, [0.1, 0.9], axis=0)
    changes = _listing_changes(panel, lay.n_stores)
    totals = [done.likelihood.log_totals(block, c, theta) for c, block in enumerate(design.blocks)]
    log_total = np.concatenate(totals)
    store = np.concatenate([block.store for block in design.blocks])
    week = np.concatenate([block.week for block in design.blocks])
    error = np.sqrt(np.maximum(np.diag(spread)[lay.ratio], 0.0)) * ratio * (1.0 - ratio) * category
    found = []
    for g, name in enumerate(catalogue.segments):
        sold = (design.segment == g) & (panel.units.sum(axis=0) > 0.0)
        found.append(
            SegmentFinding(
                segment=name,
                items=int(sold.sum()),
                dissimilarity=float(ratio[g] * category),
                standard_error=float(error[g]),
                ratio=float(ratio[g]),
                low=float(low[g]),
                high=float(high[g]),
                events=int(changes[design.segment == g].sum()),
                spread=_two_way_spread(log_total[:, g], store, week),
            )
        )
    return tuple(found)
