"""Gradient, information and scores of the nested likelihood against differences."""

import numpy as np
import pytest

from planner.demand.likelihood import Layout, MarketBlock, NestedLikelihood

SEGMENT = np.array([0, 0, 1, 1, 1, 2])


def random_problem(category: str, unscaled: bool, seed: int = 3):
    """Two clusters, 12 markets each, one segment empty in some markets."""
    rng = np.random.default_rng(seed)
    blocks = []
    for c in range(2):
        part = rng.uniform(0.2, 1.0, (12, 6)) * (rng.random((12, 6)) < 0.8)
        part[:, 0] = 1.0
        part[:3, 5] = 0.0
        with np.errstate(divide="ignore"):
            log_part = np.log(part)
        counts = rng.poisson(4.0, (12, 6)) * (part > 0.0)
        blocks.append(
            MarketBlock(
                counts.astype(float),
                log_part,
                rng.normal(size=(12, 6, 3)),
                rng.normal(size=(12, 2)) if not unscaled else np.zeros((12, 0)),
                rng.normal(size=(12, 3, 0 if unscaled else 2)),
                rng.normal(size=(12, 0 if unscaled else 2)),
                np.arange(12) // 4 + 3 * c,
                np.arange(12) % 4,
                rng.integers(150, 200, 12).astype(float),
            )
        )
    extra = 0 if unscaled else 2
    layout = Layout(2, 6, 3, 3, extra, 6, 4, category, extra, extra, unscaled)
    theta = rng.normal(0.0, 0.4, layout.size)
    if category == "none":
        theta[layout.category_ratio] = 40.0
    return NestedLikelihood(tuple(blocks), SEGMENT, layout), theta


@pytest.mark.parametrize(
    ("category", "unscaled"),
    [("volume", False), ("shoppers", False), ("none", False), ("none", True)],
)
def test_gradient_equals_central_differences(category, unscaled):
    likelihood, theta = random_problem(category, unscaled)
    gradient = likelihood.evaluate(theta).gradient
    step = 1e-5
    for k in range(theta.size):
        up, down = theta.copy(), theta.copy()
        up[k] += step
        down[k] -= step
        difference = (likelihood.value(up) - likelihood.value(down)) / (2.0 * step)
        assert gradient[k] == pytest.approx(difference, rel=2e-5, abs=2e-5), k


@pytest.mark.parametrize(("category", "unscaled"), [("volume", False), ("shoppers", False), ("none", True)])
def test_information_is_the_expected_outer_product_of_scores(category, unscaled):
    """Simulate counts from the model at theta: mean information = covariance of the gradient."""
    likelihood, theta = random_problem(category, unscaled)
    layout = likelihood.layout
    rng = np.random.default_rng(11)
    if layout.category == "volume":
        theta[layout.stores] = 3.0
    gradients, informations = [], []
    for _ in range(900):
        blocks = []
        for c, block in enumerate(likelihood.blocks):
            state = likelihood._state(block, c, theta)
            if category == "volume":
                totals = rng.poisson(np.exp(state.eta))
            elif category == "shoppers":
                totals = rng.binomial(block.shoppers.astype(int), 1.0 / (1.0 + np.exp(-state.eta)))
            else:
                totals = np.full(12, 30)
            share = state.within * state.segment_share[:, SEGMENT]
            counts = np.stack([rng.multinomial(n, p / p.sum()) for n, p in zip(totals, share, strict=True)])
            blocks.append(MarketBlock(**{**block.__dict__, "counts": counts.astype(float)}))
        evaluation = NestedLikelihood(tuple(blocks), SEGMENT, layout).evaluate(theta)
        gradients.append(evaluation.gradient)
        informations.append(evaluation.information)
    outer = np.cov(np.array(gradients).T)
    mean = np.mean(informations, axis=0)
    scale = np.sqrt(np.outer(np.diag(mean), np.diag(mean))) + 1e-12
    assert np.abs((outer - mean) / scale).max() < 0.25


def test_scores_by_store_sum_to_the_gradient():
    likelihood, theta = random_problem("volume", False)
    evaluation = likelihood.evaluate(theta, with_scores=True)
    np.testing.assert_allclose(evaluation.scores.sum(axis=0), evaluation.gradient, rtol=1e-10, atol=1e-9)
