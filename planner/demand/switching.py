"""Is proportional switching tolerable?  Tests of the restriction on choice counts.

Under the plain logit the ratio of two choice probabilities does not depend on any third item,
so that removing an item must leave the other coefficients as they are (Hausman & McFadden 1984;
Small & Hsiao 1985), and the log of an item's share inside a suspected nest must add nothing
(McFadden 1987).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.stats import chi2

from planner.base.text import _
from planner.demand.choices import ChoiceData, ChoiceFit, choice_likelihood, fit_choices, pack

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class SwitchingTest:
    """One test.  p_value is None when the statistic is not usable; why says it in words."""

    name: str
    statistic: float
    degrees: int
    p_value: float | None
    usable: bool
    why: str = ""


def _result(name: str, statistic: float, degrees: int) -> SwitchingTest:
    return SwitchingTest(name, statistic, degrees, float(chi2.sf(statistic, degrees)), True)


def without_items(data: ChoiceData, removed: Bools) -> tuple[ChoiceData, Bools]:
    """The choices made among the remaining items, and which covariates (K,) still vary there."""
    kept = np.flatnonzero(~removed)
    chosen = data.counts[:, kept].sum(axis=1) > 0.0
    covariates = data.covariates[chosen][:, kept]
    available = data.available[chosen][:, kept]
    centre = np.where(available[:, :, None], covariates, np.nan)
    spread = np.nanmax(centre, axis=1) - np.nanmin(centre, axis=1)
    varies = np.asarray((spread > 1e-12).any(axis=0))
    _names, nest = np.unique(data.nest[kept], return_inverse=True)
    left = ChoiceData(data.counts[chosen][:, kept], available, covariates[:, :, varies], nest)
    return left, varies


def _shared(
    data: ChoiceData, base_item: int | None, removed: Bools, varies: Bools
) -> tuple[Ints, Ints, int | None]:
    """Positions of the comparable parameters in the full and the restricted fit, and its base item.

    When the base item itself is removed, only the covariates' coefficients are comparable.
    """
    n_items, n_cov = removed.size, varies.size
    kept = np.flatnonzero(~removed)
    constants: list[int] = []
    if base_item is None:
        base_left = None
    elif removed[base_item]:
        base_left = kept.size - 1
    else:
        base_left = int(np.flatnonzero(kept == base_item)[0])
        constants = [int(j) for j in kept if j != base_item]
    place = {int(j): k for k, j in enumerate(kept)}
    full = [*constants, *(n_items + k for k in range(n_cov) if varies[k])]
    left = [*(place[j] for j in constants), *(kept.size + k for k in range(int(varies.sum())))]
    return np.array(full), np.array(left), base_left


def _packed(fit: ChoiceFit) -> Floats:
    packed: Floats = np.concatenate([fit.constants, fit.coefficients])
    return packed


def hausman_mcfadden(data: ChoiceData, base_item: int | None, removed: Bools) -> SwitchingTest:
    """Compare the plain logit with its refit on the items that remain (Hausman & McFadden 1984).

    "Not usable" when the difference of the covariances is not positive definite or the
    statistic is negative: then the test says nothing, and no p-value is given.
    """
    name = "Hausman-McFadden"
    left, varies = without_items(data, removed)
    in_full, in_left, base_left = _shared(data, base_item, removed, varies)
    full, restricted = fit_choices(data, base_item), fit_choices(left, base_left)
    gap = _packed(restricted)[in_left] - _packed(full)[in_full]
    difference = restricted.covariance[np.ix_(in_left, in_left)] - full.covariance[np.ix_(in_full, in_full)]
    statistic = float(gap @ np.linalg.solve(difference, gap))
    scale = np.sqrt(np.abs(np.diag(difference)))
    smallest = float(np.linalg.eigvalsh(difference / np.outer(scale, scale)).min())
    if statistic < 0.0 or smallest <= 0.0:
        why = _("the difference of the covariances is not positive definite")
        return SwitchingTest(name, statistic, gap.size, None, False, why)
    return _result(name, statistic, gap.size)


def small_hsiao(data: ChoiceData, base_item: int | None, removed: Bools, first_half: Bools) -> SwitchingTest:
    """Likelihood comparison on split halves (Small & Hsiao 1985).

    first_half (T,): the situations that form the first half; the split decides the value, so
    it is the caller's and is reported.
    """

    def part(rows: Bools) -> ChoiceData:
        return ChoiceData(data.counts[rows], data.available[rows], data.covariates[rows], data.nest)

    first, second = fit_choices(part(first_half), base_item), fit_choices(part(~first_half), base_item)
    weight = 1.0 / np.sqrt(2.0)
    mixed = weight * _packed(first) + (1.0 - weight) * _packed(second)
    left, varies = without_items(part(~first_half), removed)
    in_full, in_left, base_left = _shared(data, base_item, removed, varies)
    restricted = fit_choices(left, base_left)
    values = np.zeros(left.counts.shape[1] + left.covariates.shape[2])
    values[in_left] = mixed[in_full]
    likelihood, _layout = choice_likelihood(left)
    at_mixed = likelihood.value(pack(likelihood.layout, values))
    statistic = 2.0 * (restricted.log_likelihood - at_mixed)
    return _result("Small-Hsiao", statistic, in_left.size)


def likelihood_ratio(restricted: float, full: float, degrees: int) -> SwitchingTest:
    """Twice the gain in log-likelihood."""
    return _result("likelihood ratio", 2.0 * (full - restricted), degrees)


def omitted_variable(
    data: ChoiceData, base_item: int | None, nest: Bools
) -> tuple[SwitchingTest, SwitchingTest]:
    """Does -ln P(j | nest) add to the plain logit? (McFadden 1987.)  Wald and likelihood-ratio form.

    nest (J,): the items of the suspected nest.
    """
    plain = fit_choices(data, base_item)
    inside = np.where(nest, plain.probabilities, 0.0)
    total = inside.sum(axis=1, keepdims=True)
    with np.errstate(divide="ignore", invalid="ignore"):
        variable = np.where(nest & (inside > 0.0), -np.log(inside / total), 0.0)
    covariates = np.concatenate([data.covariates, variable[:, :, None]], axis=2)
    wider = fit_choices(ChoiceData(data.counts, data.available, covariates, data.nest), base_item)
    t = wider.coefficients[-1] / wider.coefficient_errors[-1]
    wald = _result("omitted variable, Wald", float(t**2), 1)
    ratio = likelihood_ratio(plain.log_likelihood, wider.log_likelihood, 1)
    return wald, SwitchingTest("omitted variable, likelihood ratio", ratio.statistic, 1, ratio.p_value, True)


def nest_score(data: ChoiceData, base_item: int | None, nest: Ints) -> tuple[SwitchingTest, SwitchingTest]:
    """Score test of dissimilarity 1 in the nests ``nest`` (J,), at the plain fit.

    First with the expected information, second with the outer product of the scores.
    """
    plain = fit_choices(data, base_item)
    nested = ChoiceData(data.counts, data.available, data.covariates, nest)
    likelihood, _layout = choice_likelihood(nested)
    lay = likelihood.layout
    theta = pack(lay, _packed(plain))
    shared = np.bincount(nest, minlength=lay.n_segments) > 1
    # The statistic does not depend on the parametrisation; logistic(16) is 1 - 1e-7.
    theta[lay.ratio] = np.where(shared, 16.0, theta[lay.ratio])
    free = np.zeros(lay.size, dtype=bool)
    free[lay.items] = base_item is not None
    if base_item is not None:
        free[base_item] = False
    free[lay.covariates] = True
    free[lay.ratio] = shared
    scores = likelihood.market_scores(theta)[:, free]
    gradient = scores.sum(axis=0)
    expected = likelihood.at_expected_counts(theta).evaluate(theta).information[np.ix_(free, free)]
    results = []
    for name, information in (("expected information", expected), ("outer product", scores.T @ scores)):
        unit = 1.0 / np.sqrt(np.diag(information))
        scaled = information * np.outer(unit, unit)
        statistic = float((gradient * unit) @ np.linalg.solve(scaled, gradient * unit))
        results.append(_result(f"score, {name}", statistic, int(shared.sum())))
    return results[0], results[1]
