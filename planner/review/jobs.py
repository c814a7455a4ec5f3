"""Long work as picklable records; ``engine`` does them, in a child process or directly."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from planner.base.errors import CallError
from planner.base.text import _
from planner.plan.limits import Limits
from planner.plan.plans import NamedPlan
from planner.sales.request import LoadRequest

if TYPE_CHECKING:
    from planner.demand.fitted import FittedModel
    from planner.sales.report import LoadedData
    from planner.transfer.delistings import DelistingTransfers


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
class FitDone:
    """A fit with what every view of it shows first, so that the window need not compute it."""

    fitted: FittedModel
    delistings: DelistingTransfers


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
    """A request for chosen files, by table name; sales and items are needed.

    Paths become absolute, so that the request means the same files from another folder.
    """
    given = {name: path.absolute() for name, path in files.items() if path is not None}
    missing = [name for name in ("sales", "items") if name not in given]
    if missing:
        raise CallError(
            _("no file for {names} is given.").format(names=_(" and ").join(missing)),
            remedy=_("Choose the sales history and the items table."),
        )
    return LoadRequest(
        given["sales"],
        given["items"],
        stores=given.get("stores"),
        shoppers=given.get("shoppers"),
        costs=given.get("costs"),
        ranges=given.get("ranges"),
        offers=given.get("offers"),
        successors=given.get("successors"),
        matches=matches,
        category=category,
        segment_by=segment_by,
    )
