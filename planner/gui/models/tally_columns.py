"""The tally as formatted columns."""

from __future__ import annotations

from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _, ngettext
from planner.gui.theme import numbers
from planner.gui.theme.cells import TallyColumn


class _Figure(Protocol):
    @property
    def today(self) -> float: ...
    @property
    def plan(self) -> float: ...
    @property
    def change(self) -> float: ...
    @property
    def low(self) -> float: ...
    @property
    def high(self) -> float: ...


class TallyFigures(Protocol):
    """What is read from the review's tally."""

    @property
    def margin(self) -> _Figure: ...
    @property
    def sales(self) -> _Figure: ...
    @property
    def units(self) -> _Figure: ...
    @property
    def items(self) -> tuple[int, int]: ...
    @property
    def changes(self) -> int: ...
    @property
    def space_today(self) -> NDArray[np.float64]: ...
    @property
    def space_used(self) -> NDArray[np.float64]: ...
    @property
    def space_limit(self) -> NDArray[np.float64]: ...


def _figure(title: str, figure: _Figure) -> TallyColumn:
    if figure.change == figure.low == figure.high == 0.0:
        amount = numbers.number(figure.today)
        return TallyColumn(title, amount, amount, numbers.number(0.0))
    return TallyColumn(
        title=title,
        today=numbers.number(figure.today),
        plan=numbers.number(figure.plan),
        change=numbers.number(figure.change, signed=True),
        interval=numbers.span(figure.low, figure.high, signed=True),
        value=figure.change,
        low=figure.low,
        high=figure.high,
    )


def _space(tally: TallyFigures, clusters: tuple[str, ...]) -> TallyColumn:
    """The cluster with the least room left, as a part of its limit."""
    limit = np.where(tally.space_limit > 0.0, tally.space_limit, np.nan)
    used = tally.space_used / limit
    c = int(np.nanargmax(used)) if np.isfinite(used).any() else 0
    name = clusters[c] or _("all stores")
    today, plan = float(tally.space_today[c] / limit[c]), float(used[c])
    over = plan > 1.0 + 1e-9
    points = numbers.number(100.0 * (plan - today), 1, signed=True)
    return TallyColumn(
        title=_("Fullest shelf, {cluster}").format(cluster=name),
        today=numbers.percent(today, 1),
        plan=numbers.percent(plan, 1) + ("  " + _("too full") if over else ""),
        change=_("{points} points").format(points=points),
    )


def tally_columns(
    tally: TallyFigures, clusters: tuple[str, ...], costs_known: bool = True
) -> tuple[TallyColumn, ...]:
    """Margin, sales, units, items and space, per week."""
    before, after = tally.items
    changes = ngettext("{n} change", "{n} changes", tally.changes).format(n=tally.changes)
    margin = _figure(_("Category margin a week"), tally.margin)
    if not costs_known:
        unknown = _("no costs")
        margin = TallyColumn(margin.title, unknown, unknown, _("add costs"))
    return (
        margin,
        _figure(_("Sales a week ex VAT"), tally.sales),
        _figure(_("Units a week"), tally.units),
        TallyColumn(
            title=_("Items on the list"),
            today=numbers.number(before),
            plan=numbers.number(after),
            change=f"{numbers.number(after - before, signed=True)}  ·  {changes}",
        ),
        _space(tally, clusters),
    )
