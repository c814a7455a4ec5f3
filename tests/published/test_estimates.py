"""Conditional and nested logit on published data (marks and sources beside each value).

Marks: [V-pub] recomputed and equal to a printed number that was seen; [V-mem] recomputed, the
printed number is from memory; [V-2] recomputed by two independent routes.
"""

import numpy as np
import pytest
from statsmodels.discrete.conditional_models import ConditionalLogit

from planner.demand.choices import ChoiceData, fit_choices
from tests.published.data import from_wide, one_nest, table

HEATING = ["ec", "er", "gc", "gr", "hp"]
YOGURT = ["yoplait", "dannon", "weight", "hiland"]
MODES = ["air", "train", "bus", "car"]


def heating() -> ChoiceData:
    return from_wide(table("Ecdat", "Heating"), "depvar", HEATING, ["ic", "oc"])


def yogurt() -> ChoiceData:
    return from_wide(table("Ecdat", "Yogurt"), "choice", YOGURT, ["feat", "price"])


def travel_mode(nest: list[int]) -> ChoiceData:
    """210 travellers; covariates: generalised cost, terminal time, income for air only."""
    frame = table("AER", "TravelMode")
    frame = frame.sort_values(
        ["individual", "mode"], key=lambda c: c.map(MODES.index) if c.name == "mode" else c
    )
    shape = (210, 4)
    air = np.tile([1.0, 0.0, 0.0, 0.0], (210, 1))
    covariates = np.stack(
        [
            frame["gcost"].to_numpy(float).reshape(shape),
            frame["wait"].to_numpy(float).reshape(shape),
            frame["income"].to_numpy(float).reshape(shape) * air,
        ],
        axis=2,
    )
    counts = (frame["choice"].astype(str) == "yes").to_numpy(float).reshape(shape)
    return ChoiceData(counts, np.ones(shape, dtype=bool), covariates, np.array(nest))


def test_heating_costs_only():
    """[V-pub] Train & Croissant, exercise 1 (documentation of the R package mlogit); Ecdat::Heating."""
    fit = fit_choices(heating(), base_item=None)
    np.testing.assert_allclose(fit.coefficients, [-0.0062319, -0.0045801], atol=1e-6)
    np.testing.assert_allclose(fit.coefficient_errors, [0.0003528, 0.0003222], atol=1e-6)
    assert fit.log_likelihood == pytest.approx(-1095.237, abs=1e-3)
    means = [0.10413057, 0.05141477, 0.51695653, 0.24030898, 0.08718915]
    np.testing.assert_allclose(fit.probabilities.mean(axis=0), means, atol=1e-6)
    assert fit.coefficients[1] / fit.coefficients[0] == pytest.approx(0.7349453, abs=1e-6)


def test_heating_restricted_to_life_cycle_cost():
    """[V-pub] Same source: ic + oc / 0.12 as one cost; likelihood ratio 306.930."""
    data = heating()
    cost = data.covariates[:, :, :1] + data.covariates[:, :, 1:] / 0.12
    restricted = fit_choices(ChoiceData(data.counts, data.available, cost, data.nest), base_item=None)
    assert restricted.log_likelihood == pytest.approx(-1248.702, abs=1e-3)
    full = fit_choices(data, base_item=None)
    assert 2.0 * (full.log_likelihood - restricted.log_likelihood) == pytest.approx(306.930, abs=1e-3)


def test_heating_with_constants():
    """[V-pub] Same source, constants against hp; a 10 % cut of hp's installation cost."""
    data = heating()
    fit = fit_choices(data, base_item=4)
    np.testing.assert_allclose(fit.constants[:4], [1.6588459, 1.8534370, 1.7109793, 0.3082632], atol=1e-6)
    np.testing.assert_allclose(
        fit.constant_errors[:4], [0.4484194, 0.3619551, 0.2267421, 0.2065922], atol=1e-6
    )
    np.testing.assert_allclose(fit.coefficients, [-0.0015332, -0.0069964], atol=1e-6)
    np.testing.assert_allclose(fit.coefficient_errors, [0.0006209, 0.0015541], atol=1e-6)
    assert fit.log_likelihood == pytest.approx(-1008.2287, abs=1e-4)
    observed = data.counts.mean(axis=0)
    np.testing.assert_allclose(fit.probabilities.mean(axis=0), observed, atol=1e-8)
    utility = fit.constants + data.covariates @ fit.coefficients
    utility[:, 4] -= 0.1 * data.covariates[:, 4, 0] * fit.coefficients[0]
    cheaper = np.exp(utility) / np.exp(utility).sum(axis=1, keepdims=True)
    assert cheaper[:, 4].mean() == pytest.approx(0.0644623, abs=1e-6)
    assert cheaper[:, 2].mean() == pytest.approx(0.63064443, abs=1e-6)


def test_yogurt_panel():
    """[V-mem; V-2] 2,412 purchases (Jain, Vilcassim & Chintagunta 1994 used this panel); Ecdat::Yogurt."""
    fit = fit_choices(yogurt(), base_item=3)
    np.testing.assert_allclose(fit.constants[:3], [4.450171, 3.715600, 3.074416], atol=1e-5)
    np.testing.assert_allclose(fit.constant_errors[:3], [0.187118, 0.145419, 0.145384], atol=1e-5)
    np.testing.assert_allclose(fit.coefficients, [0.491433, -0.366584], atol=1e-5)
    np.testing.assert_allclose(fit.coefficient_errors, [0.120063, 0.024366], atol=1e-5)
    assert fit.log_likelihood == pytest.approx(-2656.88788, abs=1e-5)


def test_yogurt_counts_equal_purchases():
    """[V-2] 486 distinct situations with counts give the same likelihood and coefficients."""
    data = yogurt()
    flat = data.covariates.reshape(len(data.counts), -1)
    _, first, which = np.unique(flat, axis=0, return_index=True, return_inverse=True)
    counts = np.zeros((first.size, 4))
    np.add.at(counts, which.ravel(), data.counts)
    assert first.size == 486
    grouped = ChoiceData(counts, data.available[first], data.covariates[first], data.nest)
    one, many = fit_choices(data, base_item=3), fit_choices(grouped, base_item=3)
    assert many.log_likelihood == pytest.approx(one.log_likelihood, abs=1e-6)
    np.testing.assert_allclose(many.coefficients, one.coefficients, atol=1e-6)


def test_yogurt_constants_only_closed_form():
    """[V-2] constant_j = ln(n_j / n_J), standard error sqrt(1/n_j + 1/n_J)."""
    data = yogurt()
    bare = ChoiceData(data.counts, data.available, np.zeros((*data.counts.shape, 0)), data.nest)
    fit = fit_choices(bare, base_item=3)
    np.testing.assert_allclose(fit.constants[:3], [2.44418246, 2.61461619, 2.05267812], atol=1e-8)
    np.testing.assert_allclose(fit.constant_errors[:3], [0.12372147, 0.12294484, 0.12606675], atol=1e-8)


def test_travel_mode_conditional_logit():
    """[V-mem, three libraries] Greene, Econometric Analysis (5th ed., table 21.15); AER::TravelMode."""
    fit = fit_choices(travel_mode([0, 0, 0, 0]), base_item=3)
    np.testing.assert_allclose(fit.coefficients, [-0.015502, -0.096125, 0.013287], atol=1e-5)
    np.testing.assert_allclose(fit.coefficient_errors, [0.004408, 0.010440, 0.010262], atol=1e-5)
    np.testing.assert_allclose(fit.constants[:3], [5.207443, 3.869043, 3.163194], atol=1e-5)
    np.testing.assert_allclose(fit.constant_errors[:3], [0.779055, 0.443127, 0.450266], atol=1e-5)
    assert fit.log_likelihood == pytest.approx(-199.1283687, abs=1e-6)


def test_travel_mode_equal_and_constant_shares():
    """[V-pub for constants only, V-mem for equal shares] Greene; log-likelihoods of the null models."""
    data = travel_mode([0, 0, 0, 0])
    bare = ChoiceData(data.counts, data.available, np.zeros((210, 4, 0)), one_nest(4))
    assert fit_choices(bare, base_item=3).log_likelihood == pytest.approx(-283.7587684, abs=1e-6)
    assert fit_choices(bare, base_item=None).log_likelihood == pytest.approx(-291.1218158, abs=1e-6)


def test_travel_mode_nested():
    """[V-2] Nests {air} alone and {train, bus, car}, utility-maximising form; second route biogeme 3.3.2."""
    fit = fit_choices(travel_mode([0, 1, 1, 1]), base_item=3, nested=True)
    plain = fit_choices(travel_mode([0, 0, 0, 0]), base_item=3)
    assert fit.converged
    assert fit.log_likelihood == pytest.approx(-194.9439394, abs=1e-4)
    assert fit.dissimilarity[1] == pytest.approx(0.517081, abs=2e-3)
    np.testing.assert_allclose(fit.coefficients[:2], [-0.015064, -0.059789], atol=2e-3)
    assert 2.0 * (fit.log_likelihood - plain.log_likelihood) == pytest.approx(8.3689, abs=1e-3)


@pytest.mark.parametrize(("data", "base"), [(yogurt, 3), (lambda: travel_mode([0, 0, 0, 0]), 3)])
def test_conditional_logit_equals_statsmodels(data, base):
    """The same model by statsmodels' ConditionalLogit, a general-purpose reference library."""
    choices = data()
    n_markets, n_items = choices.counts.shape
    dummies = np.tile(np.eye(n_items)[:, np.arange(n_items) != base], (n_markets, 1))
    design = np.column_stack([choices.covariates.reshape(-1, choices.covariates.shape[2]), dummies])
    groups = np.repeat(np.arange(n_markets), n_items)
    reference = ConditionalLogit(choices.counts.ravel(), design, groups=groups).fit(
        method="newton", disp=False, skip_hessian=True
    )
    ours = fit_choices(choices, base_item=base)
    k = choices.covariates.shape[2]
    np.testing.assert_allclose(ours.coefficients, reference.params[:k], atol=1e-5)
    np.testing.assert_allclose(np.delete(ours.constants, base), reference.params[k:], atol=1e-4)
