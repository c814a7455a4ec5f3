"""The estimator recovers what a panel was simulated with."""

import numpy as np
import pytest

from planner.base.errors import FitError
from planner.demand.nested import fit_nested
from planner.demand.settings import NestedSettings
from tests.demand.simulate import Recipe, simulate


@pytest.mark.parametrize("shoppers", [None, 500.0])
@pytest.mark.parametrize("seed", [5, 6])
def test_dissimilarities_and_effects_are_recovered(seed, shoppers):
    recipe = Recipe(seed=seed, shoppers=shoppers)
    panel, catalogue, base, _ = simulate(recipe)
    fit = fit_nested(panel, catalogue, base)
    assert fit.converged
    assert fit.with_shoppers == (shoppers is not None)
    for finding, true in zip(fit.segments, recipe.ratio, strict=True):
        error = finding.standard_error / fit.category_dissimilarity
        assert abs(finding.ratio - true) < 4.0 * max(error, 0.01), finding
    assert fit.category_dissimilarity == pytest.approx(recipe.category, abs=0.1)
    values = {p.name: p for p in fit.parameters}
    price = values["regular price, ln"]
    assert abs(price.value - recipe.price) < 4.0 * price.standard_error
    assert 0.8 < fit.dispersion < 1.2


def test_true_transfers_are_recovered():
    """Delistings predicted by the fit against those of the simulating model."""
    recipe = Recipe(seed=8, weeks=78)
    panel, catalogue, base, effects = simulate(recipe)
    fit = fit_nested(panel, catalogue, base)
    true = fit.estimate.__class__(
        attraction=np.exp(effects)[None],
        dissimilarity=recipe.category * np.array([recipe.ratio]),
        category_dissimilarity=np.array([recipe.category]),
        scale=np.ones((1, recipe.stores)),
        segment=fit.estimate.segment,
        cluster=fit.estimate.cluster,
        shoppers=None,
    )
    share_true, share_fit = [], []
    for item in range(recipe.items):
        without = base.today.copy()
        without[:, item] = False
        for demand, out in ((true, share_true), (fit.estimate, share_fit)):
            before, after = demand.units(base.today)[0], demand.units(without)[0]
            gained = (after - before).sum(axis=0) / before[:, item].sum()
            gained[item] = 0.0
            out.append(gained)
    wrong = 0.5 * np.abs(np.array(share_true) - np.array(share_fit)).sum(axis=1)
    assert wrong.mean() < 0.06


def test_no_segments_in_the_truth_gives_ratios_near_one():
    panel, catalogue, base, _ = simulate(Recipe(ratio=(1.0, 1.0, 1.0), category=0.9))
    fit = fit_nested(panel, catalogue, base)
    assert fit.converged
    assert all(finding.ratio > 0.9 for finding in fit.segments)


def test_plain_model_has_no_free_dissimilarity_with_shoppers():
    panel, catalogue, base, _ = simulate(Recipe(shoppers=500.0))
    fit = fit_nested(panel, catalogue, base, NestedSettings(model="plain"))
    assert fit.category_dissimilarity == 1.0
    assert all(finding.ratio == 1.0 for finding in fit.segments)


def test_nested_beats_plain_in_likelihood():
    panel, catalogue, base, _ = simulate(Recipe())
    nested = fit_nested(panel, catalogue, base)
    plain = fit_nested(panel, catalogue, base, NestedSettings(model="plain"))
    assert nested.log_likelihood > plain.log_likelihood + 20.0


def test_today_reproduces_the_baseline_category_exactly():
    for shoppers in (None, 500.0):
        panel, catalogue, base, _ = simulate(Recipe(shoppers=shoppers))
        fit = fit_nested(panel, catalogue, base)
        target = (base.units * base.today).sum(axis=1)
        for demand in (fit.estimate, fit.draws):
            category = demand.category_units(base.today)
            np.testing.assert_allclose(category, np.broadcast_to(target, category.shape), rtol=1e-9)


def test_same_seed_same_answer():
    panel, catalogue, base, _ = simulate(Recipe())
    one, two = fit_nested(panel, catalogue, base), fit_nested(panel, catalogue, base)
    np.testing.assert_array_equal(one.draws.attraction, two.draws.attraction)
    assert one.log_likelihood == two.log_likelihood


def test_too_short_a_history_says_so():
    panel, catalogue, base, _ = simulate(Recipe(stores=4, weeks=14))
    few = panel.__class__(
        **{
            **panel.__dict__,
            **{
                name: getattr(panel, name)[:5]
                for name in ("store_index", "week_index", "units", "listed", "on_sale", "regular_price")
            },
            **{name: getattr(panel, name)[:5] for name in ("price", "promotion", "display")},
        }
    )
    with pytest.raises(FitError, match="too little"):
        fit_nested(few, catalogue, base)


def test_unknown_model_is_named():
    panel, catalogue, base, _ = simulate(Recipe())
    with pytest.raises(FitError, match="'other'"):
        fit_nested(panel, catalogue, base, NestedSettings(model="other"))


def test_more_units_than_shoppers_falls_back_and_says_so():
    panel, catalogue, base, _ = simulate(Recipe(shoppers=500.0))
    wrong = panel.__class__(**{**panel.__dict__, "shoppers": panel.shoppers / 50.0})
    fit = fit_nested(wrong, catalogue, base)
    assert not fit.with_shoppers
    assert any("fewer shoppers" in note for note in fit.notes)
