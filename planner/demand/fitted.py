"""A fitted share model as later layers see it."""

from __future__ import annotations

from dataclasses import dataclass

from planner.demand.store_demand import StoreDemand


@dataclass(frozen=True)
class Parameter:
    """One common parameter.  group: "price", "promotion", "dissimilarity", "ramp-up", ..."""

    name: str
    group: str
    value: float
    standard_error: float


@dataclass(frozen=True)
class SegmentFinding:
    """How closed a segment is, and what the history holds to tell it.

    dissimilarity: lambda_g; ratio: lambda_g / lambda_c (1: proportional switching);
    low, high: 80 % interval of the ratio; events: listing changes inside the segment;
    spread: standard deviation of ln D_g left after store and week effects.
    """

    segment: str
    items: int
    dissimilarity: float
    standard_error: float
    ratio: float
    low: float
    high: float
    events: int
    spread: float


@dataclass(frozen=True)
class FittedModel:
    """Estimate, parameter draws and how the fit ended.

    model: "nested" or "plain".  log_likelihood without priors.
    estimate: StoreDemand with K = 1; draws: StoreDemand with K draws (80 % intervals come from these).
    decrement: Newton decrement at the end.  dispersion: Pearson chi-square / degrees of freedom.
    """

    model: str
    with_shoppers: bool
    log_likelihood: float
    parameters: tuple[Parameter, ...]
    segments: tuple[SegmentFinding, ...]
    category_dissimilarity: float
    category_low: float
    category_high: float
    dispersion: float
    estimate: StoreDemand
    draws: StoreDemand
    converged: bool
    iterations: int
    evaluations: int
    decrement: float
    seconds: float
    seed: int
    notes: tuple[str, ...]
