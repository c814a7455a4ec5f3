"""The last line of JSON of every command: the keys that scripts depend on."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from planner.review.review import RangeReview
from planner.tables.words import beyond_history

if TYPE_CHECKING:
    from planner.plan.plans import NamedPlan
    from planner.review.effects import ChangeFromToday
    from planner.sales.report import LoadedData
    from planner.transfer.tally import Figure, Tally


def load_answer(loaded: LoadedData) -> dict[str, Any]:
    """rows, money read = used + set aside (per reason), every check's count, sizes."""
    report, catalogue = loaded.report, loaded.catalogue
    set_aside = [check for check in report.checks if check.set_aside]
    return {
        "rows": report.rows_read,
        "rows_used": report.rows_used,
        "money_read": report.money_read,
        "money_used": report.money_used,
        "money_set_aside": sum((check.money for check in set_aside), start=report.money_read * 0),
        "set_aside": {check.code: {"rows": check.rows, "money": check.money} for check in set_aside},
        "checks": {check.code: check.rows for check in report.checks},
        "category": catalogue.category,
        "weeks": len(loaded.panel.weeks),
        "stores": len(catalogue.stores),
        "clusters": catalogue.clusters,
        "items": sum(not item.is_offer for item in catalogue.items),
        "offers": sum(item.is_offer for item in catalogue.items),
        "segments": catalogue.segments,
        "events": len(report.events),
        "notes": (*report.notes, *loaded.base.notes),
    }


def fit_answer(review: RangeReview) -> dict[str, Any]:
    """Model, log-likelihood, parameters with standard errors, how the fit ended."""
    fitted = review.need_fitted()
    return {
        "model": fitted.model,
        "with_shoppers": fitted.with_shoppers,
        "log_likelihood": fitted.log_likelihood,
        "parameters": [
            {"name": p.name, "group": p.group, "value": p.value, "standard_error": p.standard_error}
            for p in fitted.parameters
        ],
        "segments": [
            {"segment": s.segment, "ratio": s.ratio, "low": s.low, "high": s.high, "events": s.events}
            for s in fitted.segments
        ],
        "converged": fitted.converged,
        "iterations": fitted.iterations,
        "seconds": round(fitted.seconds, 3),
        "notes": fitted.notes,
    }


def figure_answer(figure: Figure, known: bool = True) -> dict[str, float | None]:
    """One measure before and after; low, high: 80 % interval of the change.  All null when unknown."""
    values = {
        "before": figure.today,
        "after": figure.plan,
        "change": figure.change,
        "low": figure.low,
        "high": figure.high,
    }
    return {key: value if known else None for key, value in values.items()}


def tally_answer(review: RangeReview, tally: Tally) -> dict[str, Any]:
    """units, sales, margin before and after, items, changes."""
    return {
        "units": figure_answer(tally.units),
        "sales": figure_answer(tally.sales),
        "margin": figure_answer(tally.margin, review.has_costs()),
        "items": {"before": tally.items[0], "after": tally.items[1]},
        "changes": tally.changes,
    }


def transfer_answer(review: RangeReview, change: ChangeFromToday) -> dict[str, Any]:
    """The tally, and the share of the changed items' units that leaves the category."""
    share, low, high = change.leaves if change.leaves is not None else (None, None, None)
    return {
        **tally_answer(review, change.tally),
        "leaves": share,
        "leaves_low": low,
        "leaves_high": high,
    }


def plan_answer(review: RangeReview, plan: NamedPlan) -> dict[str, Any]:
    """The solver's outcome, the estimate, space per cluster of the store with the least room left."""
    tally, outcome = review.single_tally(plan.states), plan.outcome
    assert outcome is not None
    names = review.need_loaded().catalogue.clusters
    space = zip(names, tally.space_today, tally.space_used, tally.space_limit, strict=True)
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
        "space": {name: {"today": today, "used": used, "limit": most} for name, today, used, most in space},
        "estimate": tally_answer(review, tally),
        "ladder": [{"changes": r.changes, "value": r.value, "bound": r.bound} for r in plan.rungs],
        "beyond_history": beyond_history(review.need_loaded(), plan.states),
        "notes": plan.notes,
    }
