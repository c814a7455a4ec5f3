"""Pieces that several commands share."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any

from planner.base.text import _
from planner.cli.output import say
from planner.review.review import RangeReview
from planner.tables.format import number, percent, span, table_text

if TYPE_CHECKING:
    from planner.plan.plans import NamedPlan
    from planner.sales.report import LoadedData, LoadReport
    from planner.transfer.tally import Figure, Tally


def add_plan(parser: argparse.ArgumentParser, required: bool = True) -> None:
    """The --plan option."""
    parser.add_argument("--plan", required=required, type=Path, metavar="P", help=_("the plan file"))


def opened(path: Path) -> RangeReview:
    """A review with this plan file open."""
    review = RangeReview()
    review.open(path)
    return review


def load_answer(loaded: LoadedData) -> dict[str, Any]:
    """JSON of a loading."""
    report = loaded.report
    return {
        "rows": report.rows_read,
        "rows_used": report.rows_used,
        "money_read": report.money_read,
        "money_used": report.money_used,
        "set_aside": {check.code: check.money for check in report.checks if check.set_aside},
        "checks": {check.code: check.rows for check in report.checks},
        "category": loaded.catalogue.category,
        "weeks": len(loaded.panel.weeks),
        "stores": len(loaded.catalogue.stores),
        "clusters": list(loaded.catalogue.clusters),
        "items": sum(not item.is_offer for item in loaded.catalogue.items),
        "offers": sum(item.is_offer for item in loaded.catalogue.items),
        "segments": list(loaded.catalogue.segments),
        "events": len(report.events),
        "notes": list(report.notes),
    }


def say_load(review: RangeReview) -> None:
    """What was read, in words."""
    report: LoadReport = review.need_loaded().report
    say(table_text(review.table("reconciliation")))
    for check in report.checks:
        say(f"  {check.title}: {check.rows} ({check.treatment})")
    for note in (*report.notes, *review.need_loaded().base.notes):
        say(f"  {note}")


def fit_answer(review: RangeReview) -> dict[str, Any]:
    """JSON of a fit."""
    fitted = review.need_fitted()
    return {
        "model": fitted.model,
        "with_shoppers": fitted.with_shoppers,
        "log_likelihood": fitted.log_likelihood,
        "parameters": [
            {"name": p.name, "group": p.group, "value": p.value, "standard_error": p.standard_error}
            for p in fitted.parameters
        ],
        "converged": fitted.converged,
        "iterations": fitted.iterations,
        "seconds": round(fitted.seconds, 3),
        "notes": list(fitted.notes),
    }


def figure_answer(figure: Figure) -> dict[str, float]:
    """JSON of one line of the tally."""
    return {
        "today": figure.today,
        "plan": figure.plan,
        "change": figure.change,
        "low": figure.low,
        "high": figure.high,
    }


def tally_answer(tally: Tally) -> dict[str, Any]:
    """JSON of the tally."""
    return {
        "margin": figure_answer(tally.margin),
        "sales": figure_answer(tally.sales),
        "units": figure_answer(tally.units),
        "items": list(tally.items),
        "changes": tally.changes,
    }


def space_answer(review: RangeReview, tally: Tally) -> dict[str, Any]:
    """Space per cluster, of the store with the least room left."""
    names = review.need_loaded().catalogue.clusters
    return {
        name: {"used": used, "limit": limit}
        for name, used, limit in zip(names, tally.space_used, tally.space_limit, strict=True)
    }


def plan_answer(review: RangeReview, plan: NamedPlan) -> dict[str, Any]:
    """JSON of a recommended plan."""
    tally = review.single_tally(plan.states)
    outcome = plan.outcome
    assert outcome is not None
    return {
        "name": plan.name,
        "goal": plan.limits.goal,
        "value": outcome.value,
        "bound": outcome.bound,
        "gap": outcome.gap,
        "status": outcome.status,
        "seconds": round(outcome.seconds, 3),
        "today_value": outcome.today_value,
        "changes": tally.changes,
        "space": space_answer(review, tally),
        "ladder": [{"changes": r.changes, "value": r.value, "bound": r.bound} for r in plan.rungs],
        "notes": plan.notes,
    }


def say_plan(review: RangeReview, plan: NamedPlan) -> None:
    """What a recommended plan changes and what it is worth: the estimate first, the solver's gap second."""
    tally = review.single_tally(plan.states)
    outcome = plan.outcome
    assert outcome is not None
    say(_("{n} changes against today.").format(n=tally.changes))
    for title, figure in ((_("Category margin"), tally.margin), (_("Sales"), tally.sales)):
        say(
            _("{title} a week: {today} today, change {change} (80 % interval {span}).").format(
                title=title,
                today=number(figure.today, 0),
                change=number(figure.change, 0, True),
                span=span(figure.low, figure.high, 0, True),
            )
        )
    say(
        _(
            "Best found {value}; under this model and these limits no plan exceeds {bound} "
            "({status}, gap {gap})."
        ).format(
            value=number(outcome.value, 1),
            bound=number(outcome.bound, 1),
            status=outcome.status,
            gap=percent(outcome.gap, 2),
        )
    )
    if plan.notes:
        say(plan.notes)
