"""From the maximum to demand per store: anchoring on the baseline, parameter draws."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve
from scipy.special import expit

from planner.catalogue.items import Catalogue
from planner.demand.design import Design
from planner.demand.estimation import Estimation
from planner.demand.likelihood import CATEGORY_SHOPPERS
from planner.demand.settings import NestedSettings
from planner.demand.store_demand import StoreDemand
from planner.sales.panel import BaseWeek, MarketPanel

Floats = NDArray[np.float64]


def parameter_spread(done: Estimation, panel: MarketPanel) -> Floats:
    """Covariance (P, P) of the parameters; rows of fixed ones are zero.

    Dispersion times the inverse of information plus prior; the rows of the common parameters
    (covariates, dissimilarities) are widened to their store-clustered sandwich errors, with the
    factor S / (S - 1), where these are larger.
    """
    lay = done.design.layout
    moving = np.flatnonzero(done.free)
    total = (done.maximum.evaluation.information + done.prior.precision)[np.ix_(moving, moving)]
    factor = cho_factor(total + 1e-10 * np.diag(np.diag(total)))
    inverse = cho_solve(factor, np.eye(moving.size))
    covariance = np.zeros((lay.size, lay.size))
    covariance[np.ix_(moving, moving)] = done.dispersion * inverse
    n_stores = len(np.unique(panel.store_index))
    if n_stores < 2:
        return covariance
    scores = done.likelihood.evaluate(done.maximum.theta, with_scores=True).scores[:, moving]
    sandwich = inverse @ (scores.T @ scores) @ inverse * n_stores / (n_stores - 1.0)
    widen = np.ones(lay.size)
    common = np.zeros(lay.size, dtype=bool)
    for part in (lay.covariates, lay.ratio, lay.category_ratio):
        common[part] = True
    own = np.sqrt(np.diag(covariance)[moving])
    widen[moving] = np.maximum(np.sqrt(np.maximum(np.diag(sandwich), 0.0)) / own, 1.0)
    widen[~common] = 1.0
    return covariance * np.outer(widen, widen)


def _anchor_items(done: Estimation, base: BaseWeek, panel: MarketPanel, kappa: float) -> Floats:
    """Shift (C, J) of the scaled effects that brings the model to the baseline window.

    The model predicts the window under its own prices, promotions and stock-outs; the log of
    actual over predicted units is shrunk by n / (n + kappa), n the item's units in the window.
    """
    lay, design = done.design.layout, done.design
    shift = np.zeros((lay.n_clusters, lay.n_items))
    first = len(panel.weeks) - base.weeks
    for c, block in enumerate(design.blocks):
        window = block.week >= first
        expected = done.likelihood.expected_counts(block, c, done.maximum.theta)[window].sum(axis=0)
        sold = block.counts[window].sum(axis=0)
        known = (expected > 0.0) & (sold > 0.0)
        weight = sold[known] / (sold[known] + kappa * done.dispersion)
        shift[c, known] = weight * np.log(sold[known] / expected[known])
    return shift


def _demand(
    sample: Floats, design: Design, catalogue: Catalogue, shift: Floats, shoppers: Floats | None
) -> StoreDemand:
    """StoreDemand of parameter vectors ``sample`` (K, P), with every store's scale still 1."""
    lay = design.layout
    n_draws = sample.shape[0]
    ratio = expit(sample[:, lay.ratio])
    category = expit(sample[:, lay.category_ratio])[:, 0]
    effects = sample[:, lay.items].reshape(n_draws, lay.n_clusters, lay.n_items) + shift
    level = sample[:, lay.season].reshape(n_draws, lay.n_segments, lay.n_season) @ design.season_now
    # A segment's season works outside the nest; inside it is the same shift for every item.
    effects = effects + (level / ratio)[:, None, design.segment]
    price = np.zeros((n_draws, lay.n_segments))
    if design.price_column >= 0:
        price += sample[:, lay.covariates.start + design.price_column][:, None]
    return StoreDemand(
        attraction=np.exp(effects),
        dissimilarity=ratio * category[:, None],
        category_dissimilarity=category,
        scale=np.ones((n_draws, lay.n_stores)),
        segment=design.segment,
        cluster=np.array(catalogue.cluster_of_store(), dtype=np.int64),
        shoppers=shoppers,
        price_effect=price,
    )


def _with_scale(demand: StoreDemand, base: BaseWeek) -> StoreDemand:
    """Set every store's scale so that today's range sells the baseline's category units, exactly."""
    target = (base.units * base.today).sum(axis=1)
    if demand.shoppers is not None:
        target = np.minimum(target, 0.999 * demand.shoppers)
        target = target / (demand.shoppers - target)
    inclusive = demand.parts(base.today).inclusive
    safe = np.where(inclusive > 0.0, inclusive, 1.0)
    scale = np.maximum(target, 1e-9) * np.exp(-demand.category_dissimilarity[:, None] * np.log(safe))
    return StoreDemand(**{**demand.__dict__, "scale": scale})


def model_draws(
    done: Estimation,
    spread: Floats,
    panel: MarketPanel,
    catalogue: Catalogue,
    base: BaseWeek,
    settings: NestedSettings,
) -> tuple[StoreDemand, StoreDemand, Floats]:
    """The estimate (K = 1), the draws, and the drawn parameter vectors (K, P).

    Parameters are drawn from the normal approximation; every draw is anchored to the same
    baseline units, so that intervals speak of switching, not of today's level.
    """
    lay = done.design.layout
    theta = done.maximum.theta
    rng = np.random.default_rng(settings.seed)
    moving = np.flatnonzero(done.free)
    covariance = spread[np.ix_(moving, moving)]
    root = np.linalg.cholesky(covariance + 1e-12 * np.diag(np.diag(covariance)))
    sample = np.tile(theta, (settings.draws, 1))
    sample[:, moving] += rng.standard_normal((settings.draws, moving.size)) @ root.T
    shift = _anchor_items(done, base, panel, settings.anchor_items)
    shoppers = base.shoppers if lay.category == CATEGORY_SHOPPERS else None
    point = _demand(theta[None, :], done.design, catalogue, shift, shoppers)
    draws = _demand(sample, done.design, catalogue, shift, shoppers)
    return _with_scale(point, base), _with_scale(draws, base), sample
