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
Ints = NDArray[np.int64]

# Newton decrement below which the last information is kept and updated.
NEAR = 0.5


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


@dataclass
class _Climb:
    """Where the iteration stands; private to ``maximise``."""

    likelihood: NestedLikelihood
    prior: Prior
    moving: Ints
    theta: Floats
    evaluation: Evaluation
    objective: float
    evaluations: int = 1

    def gradient(self) -> Floats:
        """Gradient of likelihood plus prior, free parameters only."""
        gap = self.theta - self.prior.centre
        full: Floats = self.evaluation.gradient - self.prior.precision @ gap
        return full[self.moving]

    def hessian(self) -> Floats:
        """Minus the curvature: information, curvature of the maps, prior."""
        curvature = self.likelihood.map_curvature(self.theta, self.evaluation.gradient)
        total = self.evaluation.information + np.diag(curvature) + self.prior.precision
        return total[np.ix_(self.moving, self.moving)]

    def move(self, step: Floats, with_information: bool) -> bool:
        """Halve the step until the objective does not fall; False when no step helps."""
        length = min(1.0, 2.0 / max(float(np.abs(step).max()), 1e-300))
        while length > 1e-8:
            trial = self.theta.copy()
            trial[self.moving] += length * step
            value = self.likelihood.value(trial) + self.prior.value(trial)
            self.evaluations += 1
            if value >= self.objective - 1e-12 * abs(self.objective):
                self.theta = trial
                self.evaluation = self.likelihood.evaluate(trial, with_information=with_information)
                self.evaluations += 1
                self.objective = value
                return True
            length *= 0.5
        return False


def _updated(hessian: Floats, step: Floats, fall: Floats) -> Floats:
    """BFGS update of minus the curvature (Nocedal & Wright 2006, eq. 6.19)."""
    along = hessian @ step
    if float(step @ fall) <= 1e-12 * float(step @ along):
        return hessian
    updated: Floats = hessian - np.outer(along, along) / (step @ along) + np.outer(fall, fall) / (step @ fall)
    return updated


def maximise(
    likelihood: NestedLikelihood,
    start: Floats,
    prior: Prior,
    free: Bools,
    rule: StopRule,
    progress: Progress | None = None,
) -> Maximum:
    """Fisher scoring, then BFGS steps from the last information near the top.

    Fisher scoring is fast far away and only linear near the maximum; the updates make the end
    superlinear and cost a gradient each.  Stops on the Newton decrement.
    free (P,): parameters that move; the others stay at ``start``.
    """
    watch: Progress = progress if progress is not None else NoProgress()
    first = likelihood.evaluate(start)
    climb = _Climb(
        likelihood, prior, np.flatnonzero(free), start.copy(), first, first.value + prior.value(start)
    )
    decrement, near, converged, iteration = np.inf, False, False, 0
    hessian = climb.hessian()
    while iteration < rule.iterations:
        stop_if_cancelled(watch)
        gradient = climb.gradient()
        step = _step(hessian, gradient)
        decrement = float(gradient @ step)
        if decrement < rule.decrement:
            converged = True
            break
        iteration += 1
        near = near or decrement < NEAR
        before = climb.theta
        if not climb.move(step, with_information=not near):
            # Rounding, not curvature, stops the climb here.
            converged = decrement < 1e3 * rule.decrement
            break
        moved = (climb.theta - before)[climb.moving]
        hessian = _updated(hessian, moved, gradient - climb.gradient()) if near else climb.hessian()
        watch.report(_("Fitting the share model"), min(0.95, iteration / 25))
    final = likelihood.evaluate(climb.theta)
    return Maximum(climb.theta, final, converged, iteration, climb.evaluations + 1, decrement)
