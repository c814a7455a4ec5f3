"""The ladder of changes as a table."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from planner.base.text import _
from planner.plan.plans import PlanRung, States
from planner.tables.build import count, number, percent, text
from planner.tables.format import sensible_decimals
from planner.tables.names import action_of, cluster_name
from planner.tables.plan import action_word, states_of_today
from planner.tables.table import Table

if TYPE_CHECKING:
    from planner.sales.report import LoadedData


def change_names(loaded: LoadedData, states: States) -> list[str]:
    """Every change against today as "delist 4711 in Large", item by item in the catalogue's order."""
    today = states_of_today(loaded)
    clusters = loaded.catalogue.clusters
    names = []
    for j, item in enumerate(loaded.catalogue.items):
        for c, cluster in enumerate(clusters):
            action = action_of(int(today[c, j]), int(states[c, j]))
            if states[c, j] == today[c, j] or not action:
                continue
            change = _("{action} {item}").format(action=action_word(action), item=item.code)
            if len(clusters) > 1:
                change = _("{change} in {cluster}").format(change=change, cluster=cluster_name(cluster))
            names.append(change)
    return names


def ladder_table(loaded: LoadedData, rungs: Sequence[PlanRung]) -> Table:
    """The ladder: best plan found for at most so many changes, its proven bound, and what is new in it.

    gain: value less that of the rung with the fewest changes (today's, when the ladder starts at 0).
    dropped: changes of the rung before that this one does without; not empty: the sets are not nested.
    """
    ordered = sorted(rungs, key=lambda rung: rung.changes)
    names = [change_names(loaded, rung.states) for rung in ordered]
    before = [[], *names[:-1]] if names else []
    new = [", ".join(n for n in now if n not in set(old)) for now, old in zip(names, before, strict=True)]
    gone = [", ".join(n for n in old if n not in set(now)) for now, old in zip(names, before, strict=True)]
    start = ordered[0].value if ordered else 0.0
    gaps = [(rung.bound - rung.value) / abs(rung.value) if rung.value else None for rung in ordered]
    fine = sensible_decimals(rung.value for rung in ordered)
    finer = max(fine, sensible_decimals(rung.value - start for rung in ordered))
    return Table(
        "ladder",
        _("Ladder of changes"),
        (
            count("changes", _("Changes at most"), [rung.changes for rung in ordered]),
            count("made", _("Changes made"), [len(n) for n in names]),
            number("value", _("Value a week"), [rung.value for rung in ordered], fine),
            number("gain", _("Gain"), [rung.value - start for rung in ordered], finer),
            number("bound", _("Proven bound"), [rung.bound for rung in ordered], fine),
            percent("gap", _("Gap"), gaps, 2),
            text("new", _("New against the rung before"), new),
            text("dropped", _("No longer in it"), gone),
        ),
        (
            _("Value: the estimate's, in the unit of the goal, less the cost of changes where one was set."),
            _("The gap is the search's alone; the estimate's own uncertainty is the interval of the tally."),
        ),
    )
