"""What the summary of a plan says, in sentences: the estimate's interval first, the solver's gap second."""

from __future__ import annotations

from collections import Counter

import numpy as np

from planner.base.text import _, ngettext
from planner.plan.limits import Limits
from planner.plan.plans import NamedPlan, SolverOutcome
from planner.sales.report import LoadedData
from planner.tables.format import number, percent, sensible_decimals, span
from planner.tables.names import ACTIONS, action_of, cluster_name
from planner.tables.plan import action_word, states_of_today
from planner.tables.words import beyond_history
from planner.transfer.tally import Figure, Tally


def has_costs(loaded: LoadedData) -> bool:
    """Any cost is known, so there is a margin to speak of."""
    return bool(np.isfinite(loaded.base.margin).any())


def goal_words(goal: str) -> str:
    """The goal for people."""
    words = {"margin": _("category margin"), "sales": _("sales without VAT"), "units": _("units")}
    return words.get(goal, goal)


def shown_goal(loaded: LoadedData, plan: NamedPlan, with_costs: bool) -> str:
    """The goal whose figure may be told: margin needs costs that are known and may be shown."""
    goal = plan.limits.goal
    return goal if goal != "margin" or (with_costs and has_costs(loaded)) else "sales"


def figure_of(tally: Tally, goal: str) -> Figure:
    """The tally's figure of a goal."""
    return {"margin": tally.margin, "sales": tally.sales, "units": tally.units}[goal]


def headline(loaded: LoadedData, tally: Tally, plan: NamedPlan, with_costs: bool) -> tuple[str, ...]:
    """The estimated change of the goal with its interval, and how many changes make it."""
    goal = shown_goal(loaded, plan, with_costs)
    figure = figure_of(tally, goal)
    fine = sensible_decimals([figure.change, figure.low, figure.high])
    said = _("Estimated change of {goal}: {change} a week, 80 % interval {span} (today {today}).").format(
        goal=goal_words(goal),
        change=number(figure.change, fine, signed=True),
        span=span(figure.low, figure.high, fine, signed=True),
        today=number(figure.today, fine),
    )
    if tally.changes and figure.low <= 0.0 <= figure.high:
        said += " " + _("The interval includes no change at all.")
    beyond = beyond_history(loaded, plan.states)
    return (said, changes_words(loaded, plan), *([beyond] if beyond else []))


def action_counts(loaded: LoadedData, plan: NamedPlan) -> list[tuple[str, Counter[str]]]:
    """(cluster's name, how often each action) in the catalogue's order."""
    today = states_of_today(loaded)
    return [
        (
            cluster_name(name),
            Counter(
                action_of(int(now), int(then))
                for now, then in zip(today[c], plan.states[c], strict=True)
                if now != then
            ),
        )
        for c, name in enumerate(loaded.catalogue.clusters)
    ]


def changes_words(loaded: LoadedData, plan: NamedPlan) -> str:
    """How many changes, by action."""
    total: Counter[str] = Counter()
    for _name, counts in action_counts(loaded, plan):
        total += counts
    if not total.total():
        return _("Nothing changes against today.")
    parts = [
        _("{n} {action}").format(n=total[action], action=action_word(action))
        for action in ACTIONS
        if total[action]
    ]
    return ngettext(
        "{n} change against today ({parts}); one change is one item in one cluster.",
        "{n} changes against today ({parts}); one change is one item in one cluster.",
        total.total(),
    ).format(n=total.total(), parts=", ".join(parts))


def _status_words(outcome: SolverOutcome) -> str:
    words = {
        "optimal": _("The search ended: under this model no plan within the limits is worth more"),
        "within target": _("The search ended within its target"),
        "stopped early": _("The search was stopped before its target"),
        "impossible": _("No assortment met the limits"),
    }
    return words.get(outcome.status, outcome.status)


def solver_words(loaded: LoadedData, tally: Tally, plan: NamedPlan, with_costs: bool) -> tuple[str, ...]:
    """What the solver found and proved, and what that does not mean.  Empty sentence list: made by hand."""
    outcome = plan.outcome
    if outcome is None:
        return (_("This plan was made by hand; no bound was computed for it."),)
    goal = plan.limits.goal
    told = goal != "margin" or with_costs
    said = _("{status} (gap {gap}, {seconds} s).").format(
        status=_status_words(outcome), gap=percent(outcome.gap, 2), seconds=number(outcome.seconds, 1)
    )
    sentences = [said]
    if told:
        fine = max(sensible_decimals([outcome.value]), 1)
        sentences.append(
            _(
                "Best plan found: {value} {goal} a week, today {today}; proven bound for any plan within the "
                "limits: {bound}."
            ).format(
                value=number(outcome.value, fine),
                goal=goal_words(goal),
                today=number(outcome.today_value, fine),
                bound=number(outcome.bound, fine),
            )
        )
    figure = figure_of(tally, goal)
    if figure.high - figure.low > outcome.bound - outcome.value:
        sentences.append(
            _(
                "The gap speaks of the search under this model only; the uncertainty of the estimate itself, "
                "the interval above, is larger."
            )
        )
    return tuple(sentences)


def limits_words(limits: Limits, with_costs: bool) -> tuple[str, ...]:
    """The limits that were set, one sentence each."""
    said = [_("Goal: {goal}.").format(goal=goal_words(limits.goal)), _("Space of every store binds.")]
    if limits.max_changes is not None:
        said.append(_("At most {n} changes.").format(n=limits.max_changes))
    for limit in limits.clusters:
        parts = []
        if limit.space is not None:
            parts.append(_("space at most {space}").format(space=number(limit.space, 1)))
        if limit.min_items is not None:
            parts.append(_("at least {n} items").format(n=limit.min_items))
        if limit.max_items is not None:
            parts.append(_("at most {n} items").format(n=limit.max_items))
        if parts:
            said.append(
                _("{cluster}: {parts}.").format(cluster=cluster_name(limit.cluster), parts=", ".join(parts))
            )
    if limits.locks:
        said.append(
            ngettext("{n} lock, see Limits.", "{n} locks, see Limits.", len(limits.locks)).format(
                n=len(limits.locks)
            )
        )
    if with_costs and (limits.listing_cost or limits.delisting_cost):
        said.append(
            _("Each listing counts {listing} and each delisting {delisting} a week as cost.").format(
                listing=number(limits.listing_cost, 2), delisting=number(limits.delisting_cost, 2)
            )
        )
    return tuple(said)
