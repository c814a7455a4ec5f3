"""Named plans: the state of every item in every cluster, and why."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.plan.limits import Limits

States = NDArray[np.int8]


@dataclass(frozen=True)
class SolverOutcome:
    """What the solver said of the plan (money or units per week); status as in optimise.Status."""

    status: str
    value: float
    bound: float
    gap: float
    seconds: float
    today_value: float


@dataclass(frozen=True)
class PlanRung:
    """Best plan found for at most ``changes`` changes."""

    changes: int
    value: float
    bound: float
    states: States


@dataclass(frozen=True)
class NamedPlan:
    """states (C, J): OUT 0, IN 1, AS_TODAY 2 (optimise.problem).

    reasons: (item, cluster, words) beside decisions.  created: ISO time.
    outcome: None for a plan made by hand.
    """

    name: str
    states: States
    created: str
    limits: Limits
    outcome: SolverOutcome | None = None
    rungs: tuple[PlanRung, ...] = ()
    reasons: tuple[tuple[str, str, str], ...] = ()
    notes: str = ""
