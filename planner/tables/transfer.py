"""Where sales go as the transfer command writes it: every cluster, then all together."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from planner.base.text import _
from planner.catalogue.items import Catalogue
from planner.tables.effects import Bools, effects_of, floats
from planner.tables.names import ALL_CLUSTERS, LEAVES
from planner.tables.table import Column, Table
from planner.transfer.what_if import WhatIf

# (key, kind) in the order of the file; scripts depend on it.
COLUMNS = (
    ("cluster", "text"),
    ("affected_item", "text"),
    ("units_per_week_before", "number"),
    ("units_per_week_after", "number"),
    ("change", "number"),
    ("share", "percent"),
    ("low", "percent"),
    ("high", "percent"),
)

Row = tuple[object, ...]


def _rows(
    catalogue: Catalogue, effects: WhatIf, changed: Bools, clusters: Sequence[int], name: str
) -> list[Row]:
    """Rows of some clusters summed: changed items, others by size of the change, what leaves."""
    n_items = len(catalogue.items)
    groups = np.vstack([np.eye(n_items), -np.ones((1, n_items))])
    found = effects_of(effects, changed, groups, clusters)
    before, after, change = floats(found.before), floats(found.after), floats(found.change)
    share, low, high = floats(found.share), floats(found.share_low), floats(found.share_high)
    mine: Bools = np.asarray(changed.any(axis=0))
    shown = [j for j in range(n_items) if mine[j] or found.before[j] > 0.0 or found.after[j] > 0.0]
    shown.sort(key=lambda j: (not mine[j], -abs(float(found.change[j])), catalogue.items[j].code))
    rows: list[Row] = [
        (name, catalogue.items[j].code, before[j], after[j], change[j], share[j], low[j], high[j])
        for j in shown
    ]
    rows.append((name, LEAVES, None, None, change[-1], share[-1], low[-1], high[-1]))
    return rows


def transfer_table(catalogue: Catalogue, effects: WhatIf, changed: Bools) -> Table:
    """The table of the transfer command.

    changed (C, J): the items that are delisted, listed or repriced.  share: change over the units
    that the changed items gain and lose themselves; low, high: 80 % interval of the share, from
    the same draws on both sides.  Empty share where a cluster changes nothing.  affected_item
    empty: what leaves the category (negative: what comes into it).
    """
    rows: list[Row] = []
    for c, name in enumerate(catalogue.clusters):
        rows += _rows(catalogue, effects, changed, [c], name)
    rows += _rows(catalogue, effects, changed, range(len(catalogue.clusters)), ALL_CLUSTERS)
    titles = {
        "cluster": _("Cluster"),
        "affected_item": _("Affected item"),
        "units_per_week_before": _("Units a week before"),
        "units_per_week_after": _("Units a week after"),
        "change": _("Change"),
        "share": _("Share"),
        "low": _("Share, low"),
        "high": _("Share, high"),
    }
    columns = tuple(
        Column(key, titles[key], kind, tuple(row[k] for row in rows), decimals=1)
        for k, (key, kind) in enumerate(COLUMNS)
    )
    return Table(
        "transfer",
        _("Where sales go"),
        columns,
        (
            _("An empty item stands for what leaves the category."),
            _("Share: change over the units that the changed items gain and lose; 80 % interval."),
        ),
    )
