"""Settings of the nested fit."""

from __future__ import annotations

from dataclasses import dataclass, field

from planner.demand.newton import StopRule

MODELS = ("nested", "plain")


@dataclass(frozen=True)
class Priors:
    """Standard deviations of the Gaussian priors, on the scale of the scaled utility.

    item: an item's mean effect around its attribute prediction, first pass (afterwards the
    residual spread of that prediction).  deviation: an item's cluster effects around its mean.
    covariate, season, level (discounts of a segment and of the category), store, week: effects
    around zero (stores around their mean).
    ratio_common, ratio_spread: logit(lambda_g / lambda_c), pooled mean and spread across segments.
    category: logit(lambda_c) around zero.
    """

    item: float = 2.0
    deviation: float = 0.4
    covariate: float = 2.0
    season: float = 0.3
    level: float = 1.0
    store: float = 2.0
    week: float = 0.5
    ratio_common: float = 1.5
    ratio_spread: float = 0.75
    category: float = 1.5


@dataclass(frozen=True)
class NestedSettings:
    """model: "nested" or "plain".  use_shoppers: None = where shopper counts are loaded.

    season_harmonics: sine and cosine pairs of the year, per segment.
    ramp_up, clearance: last week (counted from 0) of each bin since listing / before delisting.
    anchor_items: units at which an item's own baseline gets half the weight in anchoring.
    draws, seed: parameter draws behind every interval.
    """

    model: str = "nested"
    use_shoppers: bool | None = None
    season_harmonics: int = 2
    ramp_up: tuple[int, ...] = (1, 3, 6, 10, 15)
    clearance: tuple[int, ...] = (1, 3, 7)
    discount_memory: int = 4
    anchor_items: float = 50.0
    passes: int = 3
    priors: Priors = field(default_factory=Priors)
    stop: StopRule = field(default_factory=StopRule)
    draws: int = 200
    seed: int = 1
