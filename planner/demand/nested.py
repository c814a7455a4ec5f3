"""Fit the nested (or plain) share model to a market panel."""

from __future__ import annotations

import time

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit

from planner.base.errors import FitError
from planner.base.progress import NoProgress, Progress
from planner.base.text import _
from planner.catalogue.items import Catalogue
from planner.demand.draws import model_draws, parameter_spread
from planner.demand.estimation import estimate
from planner.demand.findings import common_parameters, segment_findings
from planner.demand.fitted import FittedModel
from planner.demand.likelihood import CATEGORY_SHOPPERS
from planner.demand.settings import MODELS, NestedSettings
from planner.sales.panel import BaseWeek, MarketPanel

Floats = NDArray[np.float64]


def _check(panel: MarketPanel, settings: NestedSettings) -> None:
    if settings.model not in MODELS:
        raise FitError(
            _("Unknown model '{model}'.").format(model=settings.model),
            remedy=_("Use one of: {models}.").format(models=", ".join(MODELS)),
        )
    if panel.n_markets < 10 or panel.units.sum() < 100:
        raise FitError(
            _("Only {markets} store-weeks with {units:.0f} units: too little to fit a share model.").format(
                markets=panel.n_markets, units=panel.units.sum()
            ),
            remedy=_("Load at least 10 store-weeks and 100 units; half a year and more is sensible."),
        )


def _uses_shoppers(panel: MarketPanel, settings: NestedSettings, notes: list[str]) -> bool:
    """Shoppers form where counts are loaded and cover the units sold."""
    if settings.use_shoppers is False or panel.shoppers is None:
        return False
    short = panel.units.sum(axis=1) > panel.shoppers
    if short.any():
        notes.append(
            _(
                "In {n} of {all} store-weeks fewer shoppers are recorded than units sold; shoppers are not "
                "used, and what leaves the category is estimated from volumes. Check the shopper counts."
            ).format(n=int(short.sum()), all=panel.n_markets)
        )
        return False
    return True


def fit_nested(
    panel: MarketPanel,
    catalogue: Catalogue,
    base: BaseWeek,
    settings: NestedSettings | None = None,
    progress: Progress | None = None,
) -> FittedModel:
    """Fit, anchor on the baseline window, draw parameters.

    Raises FitError when the history is too small; see FittedModel for what comes back.
    Estimation: Fisher scoring on the three-level likelihood (likelihood.py) with priors on the
    scaled effects; dispersion scales priors and intervals.
    """
    chosen = settings if settings is not None else NestedSettings()
    watch: Progress = progress if progress is not None else NoProgress()
    began = time.perf_counter()
    _check(panel, chosen)
    notes: list[str] = []
    with_shoppers = _uses_shoppers(panel, chosen, notes)
    watch.report(_("Preparing the share model"), 0.02)
    done = estimate(panel, catalogue, base, chosen, with_shoppers, watch)
    watch.report(_("Drawing parameters"), 0.96)
    spread = parameter_spread(done, panel)
    point, draws, sample = model_draws(done, spread, panel, catalogue, base, chosen)
    if not done.maximum.converged:
        notes.append(
            _("The fit stopped after {n} iterations before it settled (decrement {d:.2g}).").format(
                n=done.maximum.iterations, d=done.maximum.decrement
            )
        )
    lay = done.design.layout
    category = expit(sample[:, lay.category_ratio.start])
    low, high = np.quantile(category, [0.1, 0.9])
    return FittedModel(
        model=chosen.model,
        with_shoppers=lay.category == CATEGORY_SHOPPERS,
        log_likelihood=done.maximum.evaluation.value,
        parameters=common_parameters(done, spread, catalogue),
        segments=segment_findings(done, spread, sample, panel, catalogue),
        category_dissimilarity=float(expit(done.maximum.theta[lay.category_ratio])[0]),
        category_low=float(low),
        category_high=float(high),
        dispersion=done.dispersion,
        estimate=point,
        draws=draws,
        converged=done.maximum.converged,
        iterations=done.iterations,
        evaluations=done.evaluations,
        decrement=done.maximum.decrement,
        seconds=time.perf_counter() - began,
        seed=chosen.seed,
        notes=tuple(notes),
    )
