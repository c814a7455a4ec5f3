"""The answer of a run in sentences: the estimate's interval first, the solver's gap second."""

from __future__ import annotations

from planner.base.text import _, ngettext
from planner.gui.models.tally_columns import TallyFigures
from planner.gui.theme import numbers
from planner.plan.plans import NamedPlan


def answer_words(plan: NamedPlan, tally: TallyFigures, caution: str) -> tuple[str, ...]:
    """What the plan is estimated to bring, how sure that is, then how close to the best it is."""
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
    outcome = plan.outcome
    if outcome is not None:
        gap = numbers.percent(max(outcome.gap, 0.0), 2)
        words.append(
            _(
                "Solver: {status}, {seconds} s. Under the estimate and these limits no assortment is worth "
                "more than {bound}; this one is worth {value}, a gap of {gap}."
            ).format(
                status=status_words(outcome.status),
                seconds=numbers.number(outcome.seconds, 1),
                bound=numbers.number(outcome.bound),
                value=numbers.number(outcome.value),
                gap=gap,
            )
        )
    if plan.notes:
        words.append(plan.notes)
    if caution:
        words.append(caution)
    return tuple(words)


def status_words(status: str) -> str:
    """The solver's status for people."""
    known = {
        "optimal": _("best possible found"),
        "within target": _("within the target gap"),
        "stopped early": _("stopped early"),
        "impossible": _("no assortment meets the limits"),
    }
    return known.get(status, status)
