"""The list for the stores: what to do, without cost or margin unless asked."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from planner.base.text import _
from planner.plan.plans import NamedPlan
from planner.sales.report import LoadedData
from planner.tables.build import flag, money, number, text
from planner.tables.csv import write_csv
from planner.tables.names import ACTIONS, action_of, cluster_name
from planner.tables.plan import action_word, cluster_of, states_of_today
from planner.tables.table import Table
from planner.transfer.what_if import AS_TODAY, IN, presence

_FORMULA = ("=", "+", "-", "@", "\t", "\r")


def harmless(words: str) -> str:
    """A name as a spreadsheet shows it, when it would else be read as a formula."""
    return f"'{words}" if words.startswith(_FORMULA) else words


def stores_table(loaded: LoadedData, plan: NamedPlan, with_costs: bool = False) -> Table:
    """One row per store and item listed today or in the plan: actions first, then by segment.

    action: what this store does; an item extended to all stores is "keep" where it stands already.
    with_costs: adds cost and margin per unit.
    """
    catalogue, base = loaded.catalogue, loaded.base
    cluster = cluster_of(loaded)
    present = presence(plan.states, base.today, cluster)
    states = states_of_today(loaded)
    rows: list[tuple[int, int, str]] = []
    for s in range(len(catalogue.stores)):
        mine = []
        for j in range(len(catalogue.items)):
            now, then = bool(base.today[s, j]), bool(present[s, j])
            if now or then:
                mine.append((s, j, _store_action(states, plan, int(cluster[s]), j, now, then)))
        mine.sort(key=lambda row: (ACTIONS.index(row[2]), catalogue.items[row[1]].segment, row[1]))
        rows += mine
    items = [catalogue.items[j] for _s, j, _a in rows]
    space = [float(base.space_cm[j]) if present[s, j] else 0.0 for s, j, _a in rows]
    columns = [
        text("store", _("Store"), [catalogue.stores[s].code for s, _j, _a in rows]),
        text("cluster", _("Cluster"), [cluster_name(catalogue.stores[s].cluster) for s, _j, _a in rows]),
        text("action", _("Action"), [action_word(action) for _s, _j, action in rows]),
        text("item", _("Item"), [item.code for item in items]),
        text("description", _("Description"), [harmless(item.description) for item in items]),
        text("segment", _("Segment"), [harmless(item.segment) for item in items]),
        text("brand", _("Brand"), [harmless(item.brand) for item in items]),
        flag("own_label", _("Own label"), [item.own_label for item in items]),
        number("space", _("Space"), space, 1, _("cm") if base.space_known else _("places")),
        money("price", _("Price"), [float(base.price[cluster[s], j]) for s, j, _a in rows]),
    ]
    if with_costs:
        columns += [
            money("cost", _("Cost"), [float(base.cost[j]) for _s, j, _a in rows]),
            money("margin", _("Margin per unit"), [float(base.margin[cluster[s], j]) for s, j, _a in rows]),
        ]
    return Table("stores", _("Stores' list"), tuple(columns))


def _store_action(states: np.ndarray, plan: NamedPlan, c: int, j: int, now: bool, then: bool) -> str:
    """What one store does: the cluster's word where it has something to do, else keep."""
    if now == then:
        return "keep"
    if then:
        return "extend" if states[c, j] == AS_TODAY and plan.states[c, j] == IN else "list"
    return action_of(int(states[c, j]), int(plan.states[c, j]))


def write_stores_list(path: Path, loaded: LoadedData, plan: NamedPlan, with_costs: bool = False) -> None:
    """Write the list as CSV.  Raises CallError when the target cannot be written."""
    table = stores_table(loaded, plan, with_costs)
    write_csv(table, path)
