"""The tally as a table: the plan against today."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _
from planner.tables.effects import floats
from planner.tables.format import sensible_decimals
from planner.tables.names import cluster_name
from planner.tables.table import Column, Table
from planner.transfer.tally import Tally

if TYPE_CHECKING:
    from planner.sales.report import LoadedData

Row = tuple[str, str, float, float, float, float | None, float | None, float | None]


def tally_notes(loaded: LoadedData) -> tuple[str, ...]:
    """What the margin figure rests on when costs are missing, and what space means without widths."""
    base = loaded.base
    sold = base.today.any(axis=0)
    blank: NDArray[np.bool_] = np.asarray(np.isnan(base.margin).any(axis=0) & sold)
    notes = []
    if np.isnan(base.margin).all():
        notes.append(_("No cost is loaded, so there is no margin; add costs to see it. The goal is sales."))
    elif blank.any():
        units = base.units * base.today
        share = float(units[:, ~blank].sum() / max(float(units.sum()), 1e-12))
        codes = [item.code for item, has in zip(loaded.catalogue.items, blank, strict=True) if has]
        notes.append(
            _("Margin rests on the {share:.0%} of units whose cost is known; without: {names}{more}.").format(
                share=share, names=", ".join(codes[:8]), more=", ..." if len(codes) > 8 else ""
            )
        )
    if not base.space_known:
        notes.append(_("No space is loaded: today's number of items in each store is the limit."))
    return tuple(notes)


def tally_table(loaded: LoadedData, tally: Tally) -> Table:
    """One row per measure: today, plan, change, its 80 % interval; space of each cluster's tightest store.

    limit: only for space.  The margin row is missing when no cost is known.
    """
    rows: list[Row] = []
    figures = [
        ("margin", _("Category margin a week"), tally.margin),
        ("sales", _("Sales a week, without VAT"), tally.sales),
        ("units", _("Units a week"), tally.units),
    ]
    for key, title, figure in figures:
        if key != "margin" or np.isfinite(loaded.base.margin).any():
            rows.append((key, title, figure.today, figure.plan, figure.change, figure.low, figure.high, None))
    decimals = sensible_decimals(row[2] for row in rows)
    before, after = tally.items
    rows.append(("items", _("Items on the list"), before, after, after - before, None, None, None))
    rows.append(("changes", _("Changes"), 0, tally.changes, tally.changes, None, None, None))
    word = _("Space in cm, {cluster}") if loaded.base.space_known else _("Places, {cluster}")
    for c, name in enumerate(loaded.catalogue.clusters):
        today, used = float(tally.space_today[c]), float(tally.space_used[c])
        limit = floats(tally.space_limit)[c]
        title = word.format(cluster=cluster_name(name))
        rows.append(("space", title, today, used, used - today, None, None, limit))

    def numbers(position: int) -> tuple[object, ...]:
        return tuple(row[position] for row in rows)

    return Table(
        "tally",
        _("Tally"),
        (
            Column("key", _("Key"), "text", numbers(0)),
            Column("measure", _("Measure"), "text", numbers(1)),
            Column("today", _("Today"), "number", numbers(2), decimals=decimals),
            Column("plan", _("Plan"), "number", numbers(3), decimals=decimals),
            Column("change", _("Change"), "number", numbers(4), decimals=decimals),
            Column("low", _("Change, low"), "number", numbers(5), decimals=decimals),
            Column("high", _("Change, high"), "number", numbers(6), decimals=decimals),
            Column("limit", _("Limit"), "number", numbers(7), decimals=decimals),
        ),
        (_("Low and high: 80 % interval of the change."), *tally_notes(loaded)),
    )
