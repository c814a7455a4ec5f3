"""Penalised maximum likelihood of the nested share model: start, priors, passes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.progress import Progress
from planner.catalogue.items import Catalogue
from planner.demand.attributes import features, predict
from planner.demand.design import Design, build_design
from planner.demand.likelihood import NestedLikelihood
from planner.demand.newton import Maximum, Prior, maximise
from planner.demand.settings import NestedSettings
from planner.sales.panel import BaseWeek, MarketPanel

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]

# logistic(FIXED_AT_ONE) is 1 to the last digit: a dissimilarity that is not estimated.
FIXED_AT_ONE = 40.0

# Prior standard deviation of a level that the data alone should set.
FREE_LEVEL = 100.0


@dataclass(frozen=True)
class Estimation:
    """A finished maximisation with what is needed to use it; iterations and evaluations of all passes."""

    design: Design
    likelihood: NestedLikelihood
    maximum: Maximum
    prior: Prior
    free: Bools
    dispersion: float
    iterations: int
    evaluations: int


def _start(design: Design, plain: bool, shoppers: bool) -> Floats:
    """Start values: log rates per item, moderate dissimilarities, store levels."""
    lay = design.layout
    theta = np.zeros(lay.size)
    items = np.zeros((lay.n_clusters, lay.n_items))
    for c, block in enumerate(design.blocks):
        exposure = np.exp(block.log_part).sum(axis=0)
        rate = (block.counts.sum(axis=0) + 0.5) / (exposure + 1.0)
        seen = exposure > 0.0
        level = float(rate[seen].mean()) if seen.any() else 1.0
        items[c] = np.log(rate) - np.log(level)
    theta[lay.items] = items.ravel()
    theta[lay.ratio] = FIXED_AT_ONE if plain else 1.0
    theta[lay.category_ratio] = FIXED_AT_ONE if plain and shoppers else 0.0
    likelihood = NestedLikelihood(design.blocks, design.segment, lay)
    for c, block in enumerate(design.blocks):
        eta = likelihood.category_index(block, c, theta)
        sold = block.counts.sum(axis=1)
        for s in np.unique(block.store):
            own = block.store == s
            level = sold[own].mean() + 0.5
            if shoppers:
                visits = block.shoppers[own].mean() + 1.0
                level = level / max(visits - level, 1.0)
            theta[lay.stores.start + s] = np.log(level) - eta[own].mean()
    return theta


def _pooled(count: int, spread: float, common: float) -> Floats:
    """Precision of ``count`` effects N(m, spread^2) whose mean m is N(0, common^2)."""
    covariance: Floats = spread**2 * np.eye(count) + common**2 * np.ones((count, count))
    return np.asarray(np.linalg.inv(covariance), dtype=np.float64)


def _prior(
    design: Design, settings: NestedSettings, start: Floats, centre: Floats, spread: float, dispersion: float
) -> Prior:
    """The priors of settings.Priors as one Gaussian, scaled by the dispersion.

    centre (J,): attribute prediction of the items' mean effect; spread: around it.
    """
    lay, priors = design.layout, settings.priors
    mean = np.zeros(lay.size)
    precision = np.zeros((lay.size, lay.size))
    mean[lay.items] = np.tile(centre, lay.n_clusters)
    across = _pooled(lay.n_clusters, priors.deviation, spread)
    index = np.arange(lay.n_clusters * lay.n_items).reshape(lay.n_clusters, lay.n_items)
    for a in range(lay.n_clusters):
        for b in range(lay.n_clusters):
            precision[index[a], index[b]] = across[a, b]
    for part, scale in (
        (lay.covariates, priors.covariate),
        (lay.season, priors.season),
        (lay.level, priors.level),
        (lay.category_ratio, priors.category),
        (lay.category_effects, priors.level),
        (lay.weeks, priors.week),
    ):
        positions = np.arange(part.start, part.stop)
        precision[positions, positions] = 1.0 / scale**2
    precision[lay.ratio, lay.ratio] = _pooled(lay.n_segments, priors.ratio_spread, priors.ratio_common)
    # Only differences between stores are bound: their level moves with every dissimilarity.
    precision[lay.stores, lay.stores] = _pooled(lay.n_stores, priors.store, FREE_LEVEL)
    mean[lay.stores] = start[lay.stores].mean()
    return Prior(mean, precision * max(dispersion, 1.0))


def _dispersion(likelihood: NestedLikelihood, theta: Floats, free: Bools) -> float:
    """Pearson chi-square over degrees of freedom, on cells expected to sell at least half a unit."""
    chi_square, cells = 0.0, 0
    for c, block in enumerate(likelihood.blocks):
        expected = likelihood.expected_counts(block, c, theta)
        used = expected >= 0.5
        chi_square += float(((block.counts - expected)[used] ** 2 / expected[used]).sum())
        cells += int(used.sum())
    return max(chi_square / max(cells - int(free.sum()), 1), 0.2)


def estimate(
    panel: MarketPanel,
    catalogue: Catalogue,
    base: BaseWeek,
    settings: NestedSettings,
    with_shoppers: bool,
    progress: Progress,
) -> Estimation:
    """Maximise in a few passes: wide item prior first, then around the attribute prediction.

    From the second pass on, items shrink to what their attributes predict, with the spread
    that prediction leaves, and priors are scaled by the dispersion found.
    """
    design = build_design(panel, catalogue, base, settings, with_shoppers)
    lay = design.layout
    plain = settings.model == "plain"
    likelihood = NestedLikelihood(design.blocks, design.segment, lay)
    theta = _start(design, plain, with_shoppers)
    free = np.ones(lay.size, dtype=bool)
    free[lay.ratio] = not plain
    free[lay.category_ratio] = not (plain and with_shoppers)
    effects: Floats = theta[lay.items].reshape(lay.n_clusters, lay.n_items)
    centre: Floats = np.full(lay.n_items, effects.mean())
    spread, dispersion = settings.priors.item, 1.0
    distribution = base.today.mean(axis=0)
    columns, n_segments = features(catalogue, base, distribution)
    start = theta.copy()
    iterations = evaluations = 0
    for number in range(settings.passes):
        prior = _prior(design, settings, start, centre, spread, dispersion)
        maximum = maximise(likelihood, theta, prior, free, settings.stop, progress)
        theta = maximum.theta
        iterations, evaluations = iterations + maximum.iterations, evaluations + maximum.evaluations
        dispersion = _dispersion(likelihood, theta, free)
        if number < settings.passes - 1:
            effects = theta[lay.items].reshape(lay.n_clusters, lay.n_items)
            sold = sum(block.counts.sum(axis=0) for block in design.blocks)
            precision = np.asarray(sold, dtype=np.float64) / dispersion
            prediction = predict(effects.mean(axis=0), precision, columns, n_segments)
            centre, spread = prediction.centre, prediction.spread
    return Estimation(design, likelihood, maximum, prior, free, dispersion, iterations, evaluations)
