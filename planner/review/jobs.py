"""Long work as picklable records; ``engine`` does them, in a child process or directly."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from planner.plan.limits import Limits
from planner.plan.plans import NamedPlan
from planner.sales.request import LoadRequest

if TYPE_CHECKING:
    from planner.demand.fitted import FittedModel
    from planner.sales.report import LoadedData


@dataclass(frozen=True)
class LoadJob:
    """Read the files of a request."""

    request: LoadRequest


@dataclass(frozen=True)
class FitJob:
    """Fit a share model.  model: "nested" or "plain"."""

    loaded: LoadedData
    model: str = "nested"
    seed: int = 1


@dataclass(frozen=True)
class RecommendJob:
    """Find the best assortment.  seconds: allowed; gap: relative target; name: of the plan."""

    loaded: LoadedData
    fitted: FittedModel
    limits: Limits
    name: str
    seconds: float = 20.0
    gap: float = 1e-3
    seed: int = 1


@dataclass(frozen=True)
class ExportJob:
    """Write a file.  kind: "workbook", "stores list" or "report"."""

    kind: str
    path: Path
    loaded: LoadedData
    fitted: FittedModel
    plan: NamedPlan
    with_costs: bool = True
