"""Does the jobs.  The heavy parts are imported here, when first needed, so that the window opens at once."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

from planner.base.errors import CallError, DataError, LimitsError
from planner.base.progress import Progress
from planner.base.text import _
from planner.plan.plans import NamedPlan, PlanRung, SolverOutcome
from planner.review.jobs import ExportJob, FitDone, FitJob, LoadJob, RecommendJob

if TYPE_CHECKING:
    from planner.demand.fitted import FittedModel
    from planner.evidence.history import History
    from planner.planfile.lock import PlanLock
    from planner.planfile.store import PlanContents
    from planner.sales.report import LoadedData
    from planner.transfer.delistings import DelistingTransfers


def warm_up() -> Iterator[None]:
    """Import what jobs need, in the order of the work; a job that is wanted meanwhile goes first."""
    import planner.sales.load

    yield
    import planner.demand.nested

    yield
    import planner.optimise.solve

    yield
    import planner.export.workbook  # noqa: F401


def warm_window() -> None:
    """Import what the window's own process needs to take results and keep plan files."""
    import planner.evidence.history
    import planner.planfile.store
    import planner.sales.report
    import planner.transfer.delistings  # noqa: F401


def run_load(job: LoadJob, progress: Progress) -> LoadedData:
    """Read the files of the request."""
    from planner.sales.load import load

    return load(job.request, progress)


def run_load_folder(folder: Path, progress: Progress) -> LoadedData:
    """Read a folder that holds sales.*, items.* and more."""
    return run_load(request_from_folder(folder), progress)


def run_load_again(loaded: LoadedData, segment_by: tuple[str, ...], progress: Progress) -> LoadedData:
    """Read the same files with other segments.  DataError when they are not what was loaded before."""
    again = run_load(LoadJob(replace(loaded.request, segment_by=segment_by)), progress)
    before, now = loaded.report, again.report
    if (before.rows_read, before.money_read) != (now.rows_read, now.money_read):
        raise DataError(
            _(
                "the sales file holds {rows} rows and {money} money; {old_rows} and {old_money} were loaded."
            ).format(
                rows=now.rows_read,
                money=now.money_read,
                old_rows=before.rows_read,
                old_money=before.money_read,
            ),
            place=str(loaded.request.sales),
            remedy=_("The file has changed since. Load it again first."),
        )
    return again


def run_fit(job: FitJob, progress: Progress) -> FitDone:
    """Fit the share model and compute every single delisting."""
    from planner.demand.nested import fit_nested
    from planner.demand.settings import NestedSettings

    loaded = job.loaded
    settings = NestedSettings(model=job.model, seed=job.seed, draws=job.draws)
    fitted = fit_nested(loaded.panel, loaded.catalogue, loaded.base, settings, progress)
    progress.report(_("Computing transfers"))
    return FitDone(fitted, delistings_of(loaded, fitted))


def run_recommend(job: RecommendJob, progress: Progress) -> NamedPlan:
    """Find the best assortment; LimitsError when none meets the limits."""
    from planner.optimise.problem import SolverSettings, Status
    from planner.optimise.solve import best_assortment
    from planner.review.problem import listed_again, pose_problem

    posed = pose_problem(job.loaded, job.fitted, job.limits)
    settings = SolverSettings(seconds=job.seconds, gap=job.gap, seed=job.seed)
    found = best_assortment(posed.problem, settings, progress)
    if found.status is Status.IMPOSSIBLE or found.states is None:
        raise LimitsError(
            _("No assortment meets the limits. These clash: {limits}.").format(
                limits="; ".join(found.clashing)
            ),
            remedy=_("Loosen one of them and run again."),
        )
    outcome = SolverOutcome(
        found.status.value, found.value, found.bound, found.gap, found.seconds, found.today_value
    )
    return NamedPlan(
        name=job.name,
        states=found.states,
        created=datetime.now(UTC).isoformat(timespec="seconds"),
        limits=replace(job.limits, goal=posed.goal),
        outcome=outcome,
        rungs=tuple(PlanRung(r.changes, r.value, r.bound, r.states) for r in found.rungs),
        notes=" ".join((*posed.notes, *listed_again(job.loaded, found.states))),
    )


def run_export(job: ExportJob, progress: Progress) -> Path:
    """Write the workbook, the stores' list or the report."""
    progress.report(_("Writing {name}").format(name=job.path.name))
    if job.kind == "workbook":
        from planner.export.workbook import write_workbook

        write_workbook(job.path, job.loaded, job.fitted, job.plan, job.with_costs)
    elif job.kind == "stores list":
        from planner.export.lists import write_stores_list

        write_stores_list(job.path, job.loaded, job.plan, job.with_costs)
    elif job.kind == "report":
        from planner.export.report import write_report

        write_report(job.path, job.loaded, job.fitted, job.plan, job.with_costs)
    else:
        raise CallError(_("Unknown kind of export '{kind}'.").format(kind=job.kind))
    return job.path


def delistings_of(loaded: LoadedData, fitted: FittedModel) -> DelistingTransfers:
    """Every single delisting on the fitted model."""
    from planner.transfer.delistings import delistings

    return delistings(fitted, loaded.base)


def history_of(loaded: LoadedData) -> History:
    """What varied in the history."""
    from planner.evidence.history import history

    return history(loaded.panel, loaded.catalogue)


def read_plan_file(path: Path) -> PlanContents:
    """Everything in a plan file."""
    from planner.planfile.store import load

    return load(path)


def write_plan_file(path: Path, contents: dict[str, object]) -> None:
    """Save; ``contents`` are the fields of planfile's PlanContents."""
    from planner.planfile.store import PlanContents, save

    save(path, PlanContents(**contents))  # type: ignore[arg-type]


def lock_plan_file(path: Path) -> PlanLock:
    """Hold the plan file for this program copy; the returned lock has ``release``."""
    from planner.planfile.lock import PlanLock

    return PlanLock(path)


def request_from_folder(folder: Path) -> LoadJob:
    """A load job for a folder that holds sales.*, items.* and more."""
    from planner.sales.load import request_from_folder as request

    return LoadJob(request(folder.absolute()))


def write_set_aside(path: Path, loaded: LoadedData) -> None:
    """The rows that were not used, with file, row number and reason, as CSV."""
    from planner.base.target_file import replacing

    with replacing(path, (".csv",)) as part:
        loaded.set_aside.to_csv(part, index=False, lineterminator="\n")
