"""What items cost now: costs table, else the sales rows, else the items table."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _
from planner.sales.checks import Ledger
from planner.sales.matching import Matched
from planner.sales.money import decimal_marks, read_numbers
from planner.sales.side_tables import Axes, note_unreadable, positions
from planner.sales.weeks import Calendar, monday_of, read_days

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


def read_costs(table: Matched, axes: Axes, calendar: Calendar, ledger: Ledger) -> tuple[Floats, list[str]]:
    """(cost now (J,), NaN where the table has none in force, notes).

    A cost is valid from its week until the next row of the item; a blank week means from the start.
    Costs of a code that was replaced are not those of its successor.
    """
    known = positions(axes.items, np.arange(axes.item.size), table, "item", ledger)
    item = np.where(known >= 0, np.append(axes.item, -1)[known], -1)
    mark = decimal_marks(table, ("cost",))["cost"]
    numbers = read_numbers(table.column("cost"), mark)
    note_unreadable(table, "cost", numbers.bad, ledger)
    week = np.zeros(len(table.raw), dtype=np.int32)
    use = (item >= 0) & (np.nan_to_num(numbers.values) > 0.0) & ~np.append(axes.replaced, False)[known]
    if table.has("from"):
        days = read_days(table, "from", table.column("from"), calendar)
        note_unreadable(table, "from", days.bad, ledger)
        use &= ~days.bad
        week = np.where(days.blank, 0, days.week)
    last = axes.start + axes.n_weeks - 1
    later = use & (week > last)
    use &= week <= last
    cost = np.full(axes.n_items, np.nan)
    order = np.argsort(week[use], kind="stable")
    cost[item[use][order]] = numbers.values[use][order]
    notes = []
    if later.any():
        notes.append(
            _("{n} costs are valid only after the last week of sales ({day}) and are not used.").format(
                n=int(later.sum()), day=monday_of(last).isoformat()
            )
        )
    return cost, notes


def cost_from_sales(cost: Floats | None, units: Floats, weeks: int, n_items: int) -> Floats:
    """Mean unit cost (J,) in the last weeks with a value, weighted by units; cost, units (S, W, J)."""
    if cost is None:
        return np.full(n_items, np.nan)
    cost, units = cost[:, -weeks:], units[:, -weeks:]
    weight = np.where(np.isnan(cost) | (cost <= 0.0), 0.0, np.maximum(units, 1e-9))
    total = weight.sum(axis=(0, 1))
    mean: Floats = (weight * np.nan_to_num(cost)).sum(axis=(0, 1)) / np.where(total > 0.0, total, np.nan)
    return mean
