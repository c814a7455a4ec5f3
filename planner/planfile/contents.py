"""What a plan file holds."""

from __future__ import annotations

from dataclasses import dataclass, field

from planner.demand.fitted import FittedModel
from planner.plan.limits import Limits
from planner.plan.plans import NamedPlan, States
from planner.sales.report import LoadedData


@dataclass(frozen=True)
class PlanContents:
    """Everything of one review.

    loaded, fitted: None before loading or fitting.  states (C, J): the plan being worked on.
    settings: the program's own small choices; keys are texts, values texts, numbers, flags, lists,
    tuples, dictionaries, dates, or records of the program.
    """

    loaded: LoadedData | None = None
    fitted: FittedModel | None = None
    states: States | None = None
    limits: Limits = field(default_factory=Limits)
    plans: tuple[NamedPlan, ...] = ()
    settings: dict[str, object] = field(default_factory=dict)
