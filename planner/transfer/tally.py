"""The tally: the plan against today, with the interval of every difference."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from planner.demand.fitted import FittedModel
from planner.sales.panel import BaseWeek
from planner.transfer.what_if import (
    Bools,
    Floats,
    Ints,
    States,
    WhatIf,
    interval,
    presence,
    today_states,
    what_if,
)


@dataclass(frozen=True)
class Figure:
    """today, plan: per week; change = plan - today; low, high: 80 % interval of the change."""

    today: float
    plan: float
    change: float
    low: float
    high: float


@dataclass(frozen=True)
class Tally:
    """margin, sales: money ex VAT per week; units per week.

    items: (today, plan) number of different items on the list anywhere;
    changes: number of (item, cluster) pairs whose state differs from today.
    space_today, space_used, space_limit (C,): of the store with the least room left, in the
    unit of BaseWeek.space_cm.  effects: the units behind the figures.
    """

    margin: Figure
    sales: Figure
    units: Figure
    items: tuple[int, int]
    changes: int
    space_today: Floats
    space_used: Floats
    space_limit: Floats
    effects: WhatIf


def _figure(effects: WhatIf, weight: Floats, weight_after: Floats) -> Figure:
    """Sum of weight (C, J) x units before, and of weight_after x units after."""
    today = float((effects.before * weight).sum())
    plan = float((effects.after * weight_after).sum())
    draws = np.einsum("kcj,cj->k", effects.draws_after, weight_after)
    draws = draws - np.einsum("kcj,cj->k", effects.draws_before, weight)
    low, high = interval(draws)
    return Figure(today, plan, plan - today, float(low), float(high))


def _tightest(base: BaseWeek, cluster: Ints, present: Bools, n: int) -> Ints:
    """Position (C,) of the store with the least room left in each cluster."""
    room = base.space_limit - present.astype(np.float64) @ base.space_cm
    return np.array([np.flatnonzero(cluster == c)[np.argmin(room[cluster == c])] for c in range(n)])


def tally(fitted: FittedModel, base: BaseWeek, states: States, price_ratio: Floats | None = None) -> Tally:
    """Value the plan ``states`` (C, J) against today on the fitted model and its draws.

    price_ratio (C, J): the plan's regular prices over today's; margin and sales move with them.
    """
    cluster = fitted.estimate.cluster
    n_clusters = states.shape[0]
    present = presence(states, base.today, cluster)
    effects = what_if(fitted, base.today, present, price_ratio)
    ratio = np.ones_like(base.price) if price_ratio is None else price_ratio
    dearer = base.net_price * (ratio - 1.0)
    stores = _tightest(base, cluster, present, n_clusters)
    use = present.astype(np.float64) @ base.space_cm
    use_today = base.today.astype(np.float64) @ base.space_cm
    now = today_states(base.today, cluster, n_clusters)
    return Tally(
        margin=_figure(effects, np.nan_to_num(base.margin), np.nan_to_num(base.margin + dearer)),
        sales=_figure(effects, np.nan_to_num(base.net_price), np.nan_to_num(base.net_price + dearer)),
        units=_figure(effects, np.ones_like(base.price), np.ones_like(base.price)),
        items=(int(base.today.any(axis=0).sum()), int(present.any(axis=0).sum())),
        changes=int((now != states).sum()),
        space_today=use_today[stores],
        space_used=use[stores],
        space_limit=base.space_limit[stores],
        effects=effects,
    )
