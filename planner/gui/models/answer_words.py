"""The answer of a run in sentences: the estimate's interval first, the solver's gap second."""

from __future__ import annotations

import math

from planner.base.text import _, ngettext
from planner.gui.models.tally_columns import TallyFigures
from planner.gui.theme import numbers
from planner.plan.plans import NamedPlan, PlanRung, SolverOutcome


def answer_words(
    plan: NamedPlan, tally: TallyFigures, caution: str, rung: PlanRung | None = None
) -> tuple[str, ...]:
    """What the plan is estimated to bring, how sure that is, then how close to the best it is.

    rung: the step of the ladder that ``tally`` speaks of; None: the whole plan.
    """
    goal = plan.limits.goal
    figure = {"margin": tally.margin, "sales": tally.sales, "units": tally.units}[goal]
    names = {
        "margin": _("category margin a week"),
        "sales": _("sales a week without VAT"),
        "units": _("units a week"),
    }
    changes = ngettext("{n} change", "{n} changes", tally.changes).format(n=tally.changes)
    words = [
        _("{plan}, {changes}: {change} {what}, with an 80 % interval of {interval}.").format(
            plan=plan.name,
            changes=changes,
            change=numbers.number(figure.change, signed=True),
            what=names[goal],
            interval=numbers.span(figure.low, figure.high, signed=True),
        )
    ]
    if figure.low < 0.0 < figure.high:
        words.append(_("The interval holds zero: the history cannot tell whether this plan gains."))
    if plan.outcome is not None:
        words.append(_solver_words(plan.outcome, rung))
    if plan.notes:
        words.append(plan.notes)
    if caution:
        words.append(caution)
    return tuple(words)


def _solver_words(outcome: SolverOutcome, rung: PlanRung | None) -> str:
    """How close to the best under the estimate: of the whole plan, or of one rung."""
    value, bound = (outcome.value, outcome.bound) if rung is None else (rung.value, rung.bound)
    gap = numbers.percent(max((bound - value) / abs(value), 0.0) if value else math.nan, 2)
    parts = {"bound": numbers.number(bound), "value": numbers.number(value), "gap": gap or _("unknown")}
    if rung is not None:
        words = _(
            "Solver: with at most {n} changes no assortment is worth more than {bound} under the estimate "
            "and these limits; this one is worth {value}, a gap of {gap}."
        )
        return words.format(n=rung.changes, **parts)
    words = _(
        "Solver: {status}, {seconds} s. Under the estimate and these limits no assortment is worth more "
        "than {bound}; this one is worth {value}, a gap of {gap}."
    )
    return words.format(
        status=status_words(outcome.status), seconds=numbers.number(outcome.seconds, 1), **parts
    )


def status_words(status: str) -> str:
    """The solver's status for people."""
    known = {
        "optimal": _("best possible found"),
        "within target": _("within the target gap"),
        "stopped early": _("stopped early"),
        "impossible": _("no assortment meets the limits"),
    }
    return known.get(status, status)
