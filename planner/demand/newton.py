"""Fisher scoring on a log-likelihood with a Gaussian prior, some parameters held fixed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve

from planner.base.errors import FitError
from planner.base.progress import NoProgress, Progress, stop_if_cancelled
from planner.base.text import _
from planner.demand.likelihood import Evaluation, NestedLikelihood

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class Prior:
    """Gaussian: centre (P,), precision (P, P), already in units of the log-likelihood."""

    centre: Floats
    precision: Floats

    def value(self, theta: Floats) -> float:
        """Log-density up to a constant."""
        gap = theta - self.centre
        return -0.5 * float(gap @ self.precision @ gap)


@dataclass(frozen=True)
class StopRule:
    """decrement: g' H^-1 g below which the fit has converged; iterations: the most allowed."""

    decrement: float = 1e-7
    iterations: int = 100


@dataclass(frozen=True)
class Maximum:
    """Where the iteration ended.  information: of the data alone, without the prior."""

    theta: Floats
    evaluation: Evaluation
    converged: bool
    iterations: int
    evaluations: int
    decrement: float


def _step(hessian: Floats, gradient: Floats) -> Floats:
    """Solve hessian x = gradient, adding a little to the diagonal when it is singular."""
    scale = np.sqrt(np.maximum(np.diag(hessian), 1e-12))
    scaled = hessian / np.outer(scale, scale)
    ridge = 0.0
    while ridge < 1.0:
        try:
            factor = cho_factor(scaled + ridge * np.eye(len(scale)))
        except np.linalg.LinAlgError:
            ridge = max(10.0 * ridge, 1e-12)
            continue
        solution: Floats = cho_solve(factor, gradient / scale) / scale
        return solution
    raise FitError(
        _("The information matrix is singular: some effects cannot be told apart."),
        remedy=_("Check for items that were never on sale together, or merge segments."),
    )


def maximise(
    likelihood: NestedLikelihood,
    start: Floats,
    prior: Prior,
    free: Bools,
    rule: StopRule,
    progress: Progress | None = None,
) -> Maximum:
    """Fisher scoring with step halving; stops on the Newton decrement.

    free (P,): parameters that move; the others stay at ``start``.
    """
    watch: Progress = progress if progress is not None else NoProgress()
    theta = start.copy()
    evaluation = likelihood.evaluate(theta)
    objective = evaluation.value + prior.value(theta)
    evaluations, decrement = 1, np.inf
    moving = np.flatnonzero(free)
    for iteration in range(1, rule.iterations + 1):
        stop_if_cancelled(watch)
        gradient = evaluation.gradient - prior.precision @ (theta - prior.centre)
        curvature = np.diag(likelihood.map_curvature(theta, evaluation.gradient))
        hessian = (evaluation.information + curvature + prior.precision)[np.ix_(moving, moving)]
        step = np.zeros_like(theta)
        step[moving] = _step(hessian, gradient[moving])
        decrement = float(gradient[moving] @ step[moving])
        if decrement < rule.decrement:
            return Maximum(theta, evaluation, True, iteration - 1, evaluations, decrement)
        length = min(1.0, 2.0 / max(float(np.abs(step[moving]).max()), 1e-300))
        while True:
            trial = theta + length * step
            value = likelihood.value(trial) + prior.value(trial)
            evaluations += 1
            if value >= objective - 1e-10 * abs(objective):
                break
            length *= 0.5
            if length < 1e-10:
                # Rounding, not curvature, stops the climb here.
                settled = decrement < 1e3 * rule.decrement
                return Maximum(theta, evaluation, settled, iteration, evaluations, decrement)
        theta = trial
        evaluation = likelihood.evaluate(theta)
        evaluations += 1
        objective = evaluation.value + prior.value(theta)
        watch.report(_("Fitting the share model"), min(0.95, iteration / 25))
    return Maximum(theta, evaluation, False, rule.iterations, evaluations, decrement)
