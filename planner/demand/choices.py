"""The share model on plain choice counts: no stores, no weeks, no category volume.

Individual choices are counts in markets of size one; aggregated situations carry their counts.
The same likelihood as the market panel's (likelihood.py) with the category level switched off.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit

from planner.base.errors import FitError
from planner.base.text import _
from planner.demand.estimation import FIXED_AT_ONE
from planner.demand.likelihood import CATEGORY_NONE, Layout, MarketBlock, NestedLikelihood
from planner.demand.newton import Maximum, Prior, StopRule, maximise

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class ChoiceData:
    """counts (T, J); available (T, J); covariates (T, J, K); nest (J,): position of each item's nest."""

    counts: Floats
    available: Bools
    covariates: Floats
    nest: Ints


@dataclass(frozen=True)
class ChoiceFit:
    """constants (J,): item effects alpha_j, 0 for the base item; coefficients (K,); dissimilarity (G,).

    Standard errors from the inverse information, 0 for what was held fixed.
    probabilities (T, J): fitted.  covariance over (constants, coefficients, dissimilarity), in order.
    """

    constants: Floats
    constant_errors: Floats
    coefficients: Floats
    coefficient_errors: Floats
    dissimilarity: Floats
    dissimilarity_errors: Floats
    log_likelihood: float
    probabilities: Floats
    covariance: Floats
    converged: bool
    iterations: int


def _check(data: ChoiceData) -> None:
    chosen_elsewhere = (data.counts > 0.0) & ~data.available
    if chosen_elsewhere.any():
        t, j = np.argwhere(chosen_elsewhere)[0]
        raise FitError(
            _("Item {j} was chosen in situation {t}, where it is marked as not available.").format(j=j, t=t),
            remedy=_("Correct the availability or the counts."),
        )


def choice_likelihood(data: ChoiceData) -> tuple[NestedLikelihood, MarketBlock]:
    """The likelihood of choices among the items, and its only block."""
    n_markets, n_items = data.counts.shape
    n_nests = int(data.nest.max()) + 1
    layout = Layout(1, n_items, data.covariates.shape[2], n_nests, 0, 0, 0, CATEGORY_NONE, unscaled=True)
    block = MarketBlock(
        counts=np.asarray(data.counts, dtype=np.float64),
        log_part=np.where(data.available, 0.0, -np.inf),
        covariates=np.asarray(data.covariates, dtype=np.float64),
        season=np.zeros((n_markets, 0)),
        level=np.zeros((n_markets, n_nests, 0)),
        category=np.zeros((n_markets, 0)),
        store=np.zeros(n_markets, dtype=np.int64),
        week=np.zeros(n_markets, dtype=np.int64),
        shoppers=np.zeros(n_markets),
    )
    return NestedLikelihood((block,), data.nest, layout), block


def pack(layout: Layout, values: Floats) -> Floats:
    """theta of the plain logit with these constants and coefficients, in this order."""
    theta = np.zeros(layout.size)
    theta[: values.size] = values
    theta[layout.ratio] = FIXED_AT_ONE
    theta[layout.category_ratio] = FIXED_AT_ONE
    return theta


def _textbook(maximum: Maximum, layout: Layout, free: Bools, nest: Ints) -> tuple[Floats, Floats]:
    """Estimates (alpha, beta, lambda) and their covariance from the scaled parameters (delta method).

    alpha_j = lambda_g A_j; beta as it stands; lambda_g = logistic(r_g) since lambda_c = 1.
    """
    theta = maximum.theta
    n_items, n_cov, n_seg = layout.n_items, layout.n_covariates, layout.n_segments
    lam = expit(theta[layout.ratio])
    effects = theta[layout.items]
    slope = lam * (1.0 - lam)
    jacobian = np.zeros((n_items + n_cov + n_seg, layout.size))
    rows = np.arange(n_items)
    jacobian[rows, rows] = lam[nest]
    jacobian[rows, layout.ratio.start + nest] = effects * slope[nest]
    jacobian[n_items + np.arange(n_cov), layout.covariates.start + np.arange(n_cov)] = 1.0
    ratio_rows = n_items + n_cov + np.arange(n_seg)
    jacobian[ratio_rows, layout.ratio.start + np.arange(n_seg)] = slope
    moving = np.flatnonzero(free)
    covariance = np.zeros((layout.size, layout.size))
    information = maximum.evaluation.information[np.ix_(moving, moving)]
    covariance[np.ix_(moving, moving)] = np.linalg.inv(information) if moving.size else information
    values = np.concatenate([lam[nest] * effects, theta[layout.covariates], lam])
    spread: Floats = jacobian @ covariance @ jacobian.T
    return values, spread


def fit_choices(
    data: ChoiceData,
    base_item: int | None,
    nested: bool = False,
    stop: StopRule | None = None,
) -> ChoiceFit:
    """Conditional logit (McFadden 1974), or nested logit in the utility-maximising form (McFadden 1978).

    base_item: position of the item whose constant is 0; None: no constants at all.
    nested: dissimilarities of nests with two or more items are estimated in (0, 1); lone items
    keep 1.  Raises FitError on choices of unavailable items or effects that cannot be told apart.
    """
    _check(data)
    likelihood, block = choice_likelihood(data)
    layout = likelihood.layout
    n_nests = layout.n_segments
    free = np.ones(layout.size, dtype=bool)
    free[layout.items] = base_item is not None
    if base_item is not None:
        free[base_item] = False
    shared = np.bincount(data.nest, minlength=n_nests) > 1
    free[layout.ratio] = shared & nested
    free[layout.category_ratio] = False
    theta = pack(layout, np.zeros(layout.n_items + layout.n_covariates))
    theta[layout.ratio] = np.where(shared & nested, 1.0, FIXED_AT_ONE)
    flat = Prior(np.zeros(layout.size), np.zeros((layout.size, layout.size)))
    maximum = maximise(likelihood, theta, flat, free, stop or StopRule(1e-12, 200))
    values, spread = _textbook(maximum, layout, free, data.nest)
    errors = np.sqrt(np.maximum(np.diag(spread), 0.0))
    first, second = layout.n_items, layout.n_items + layout.n_covariates
    shares = likelihood.shares(block, 0, maximum.theta)
    return ChoiceFit(
        constants=values[:first],
        constant_errors=errors[:first],
        coefficients=values[first:second],
        coefficient_errors=errors[first:second],
        dissimilarity=values[second:],
        dissimilarity_errors=errors[second:],
        log_likelihood=maximum.evaluation.value,
        probabilities=shares,
        covariance=spread,
        converged=maximum.converged,
        iterations=maximum.iterations,
    )
