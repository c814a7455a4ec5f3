"""Long work as picklable records; ``engine`` does them, in a child process or directly."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
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
    """Fit a share model.  model: "nested" or "plain"; draws: parameter draws behind the intervals."""

    loaded: LoadedData
    model: str = "nested"
    seed: int = 1
    draws: int = 200


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


def load_request(
    files: Mapping[str, Path | None],
    matches: tuple[tuple[str, str, str], ...] = (),
    category: str = "",
    segment_by: tuple[str, ...] = (),
) -> LoadRequest:
    """A request for chosen files, by table name; sales and items are needed."""
    sales, items = files["sales"], files["items"]
    assert sales is not None
    assert items is not None
    return LoadRequest(
        sales,
        items,
        stores=files.get("stores"),
        shoppers=files.get("shoppers"),
        costs=files.get("costs"),
        ranges=files.get("ranges"),
        offers=files.get("offers"),
        successors=files.get("successors"),
        matches=matches,
        category=category,
        segment_by=segment_by,
    )


def request_with_segments(request: LoadRequest, segment_by: tuple[str, ...]) -> LoadRequest:
    """The same files with other segments."""
    return replace(request, segment_by=segment_by)
