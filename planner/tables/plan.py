"""A plan as tables: the recommend command's file, the item list for people, saved plans compared."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _
from planner.plan.plans import NamedPlan, States
from planner.tables.build import count, flag, money, number, percent, text
from planner.tables.effects import Floats
from planner.tables.format import sensible_decimals
from planner.tables.names import ACTIONS, STATE_WORDS, action_of, cluster_name, part_of_stores
from planner.tables.table import Table
from planner.transfer.what_if import OUT, WhatIf, today_states

if TYPE_CHECKING:
    from planner.sales.report import LoadedData
    from planner.transfer.tally import Tally

# cluster, item, action
Pair = tuple[int, int, str]


def cluster_of(loaded: LoadedData) -> NDArray[np.int64]:
    """Cluster position (S,) of every store."""
    return np.array(loaded.catalogue.cluster_of_store(), dtype=np.int64)


def states_of_today(loaded: LoadedData) -> States:
    """States (C, J) of today's range."""
    return today_states(loaded.base.today, cluster_of(loaded), len(loaded.catalogue.clusters))


def _pairs(loaded: LoadedData, states: States) -> list[Pair]:
    """Everything listed today or in the plan, in the catalogue's order."""
    today = states_of_today(loaded)
    pairs = []
    for c in range(states.shape[0]):
        for j in range(states.shape[1]):
            action = action_of(int(today[c, j]), int(states[c, j]))
            if action:
                pairs.append((c, j, action))
    return pairs


def _take(values: Floats, pairs: list[Pair]) -> list[float]:
    return [float(values[c, j]) for c, j, _action in pairs]


def plan_table(loaded: LoadedData, effects: WhatIf, states: States) -> Table:
    """The table of the recommend command: one row per cluster and item listed today or in the plan.

    today: part of the cluster's stores.  units_per_week, margin_per_week: of the plan (margin empty
    where the cost is unknown).  An item without a row is on no list today and on none in the plan.
    """
    catalogue, base = loaded.catalogue, loaded.base
    pairs = _pairs(loaded, states)
    part = part_of_stores(base.today, cluster_of(loaded), len(catalogue.clusters))
    return Table(
        "plan",
        _("Plan"),
        (
            text("cluster", _("Cluster"), [catalogue.clusters[c] for c, _j, _a in pairs]),
            text("item", _("Item"), [catalogue.items[j].code for _c, j, _a in pairs]),
            number("today", _("Stores today"), _take(part, pairs), 2),
            text("plan", _("Plan"), [STATE_WORDS[int(states[c, j])] for c, j, _a in pairs]),
            text("action", _("Action"), [action for _c, _j, action in pairs]),
            number("units_per_week", _("Units a week"), _take(effects.after, pairs)),
            money("margin_per_week", _("Margin a week"), _take(effects.after * base.margin, pairs)),
        ),
    )


def action_word(action: str) -> str:
    """An action for people."""
    words = {
        "list": _("list"),
        "extend": _("extend"),
        "withdraw": _("withdraw"),
        "delist": _("delist"),
        "keep": _("keep"),
    }
    return words[action]


def _reason(reasons: Sequence[tuple[str, str, str]], item: str, cluster: str) -> str:
    return "; ".join(words for code, where, words in reasons if code == item and where in ("", cluster))


def item_list_table(
    loaded: LoadedData,
    effects: WhatIf,
    states: States,
    reasons: Sequence[tuple[str, str, str]] = (),
    cluster: str | None = None,
) -> Table:
    """The plan for people: per cluster, actions first, with names, space, figures and the reasons.

    reasons: (item, cluster, words), cluster empty for all.  cluster: only this one.
    """
    clusters, items, base = loaded.catalogue.clusters, loaded.catalogue.items, loaded.base
    pairs = [pair for pair in _pairs(loaded, states) if cluster is None or clusters[pair[0]] == cluster]

    def rank(pair: Pair) -> tuple[int, int, str, float, str]:
        c, j, action = pair
        return c, ACTIONS.index(action), items[j].segment, -float(effects.after[c, j]), items[j].code

    pairs.sort(key=rank)
    part = part_of_stores(base.today, cluster_of(loaded), len(clusters))
    records = [items[j] for _c, j, _a in pairs]
    space = np.where(states == OUT, 0.0, base.space_cm[None, :])
    unit = _("cm") if base.space_known else _("places")
    return Table(
        "item_list",
        _("Item list"),
        (
            text("cluster", _("Cluster"), [cluster_name(clusters[c]) for c, _j, _a in pairs]),
            text("action", _("Action"), [action_word(action) for _c, _j, action in pairs]),
            text("item", _("Item"), [item.code for item in records]),
            text("description", _("Description"), [item.description for item in records]),
            text("segment", _("Segment"), [item.segment for item in records]),
            text("brand", _("Brand"), [item.brand for item in records]),
            text("supplier", _("Supplier"), [item.supplier for item in records]),
            flag("own_label", _("Own label"), [item.own_label for item in records]),
            percent("today", _("Stores today"), _take(part, pairs)),
            text("plan", _("Plan"), [STATE_WORDS[int(states[c, j])] for c, j, _a in pairs]),
            number("space", _("Space"), _take(space, pairs), unit=unit),
            money("price", _("Price"), _take(base.price, pairs)),
            number("units_today", _("Units a week today"), _take(effects.before, pairs)),
            number("units", _("Units a week, plan"), _take(effects.after, pairs)),
            number("units_change", _("Change in units"), _take(effects.after - effects.before, pairs)),
            money("sales", _("Sales a week, plan"), _take(effects.after * base.net_price, pairs)),
            money("margin", _("Margin a week, plan"), _take(effects.after * base.margin, pairs)),
            text("reason", _("Reason"), [_reason(reasons, items[j].code, clusters[c]) for c, j, _a in pairs]),
        ),
    )


def plans_compared_table(loaded: LoadedData, plans: Sequence[NamedPlan], tallies: Sequence[Tally]) -> Table:
    """Saved plans side by side: figures against today, and what the solver said.

    tallies: one per plan.  Margin is empty where no cost is known.
    """
    outcomes = [plan.outcome for plan in plans]
    margins = [t.margin if np.isfinite(loaded.base.margin).any() else None for t in tallies]
    fine = sensible_decimals(t.sales.plan for t in tallies)
    return Table(
        "plans",
        _("Saved plans"),
        (
            text("name", _("Plan"), [plan.name for plan in plans]),
            text("created", _("Made"), [plan.created for plan in plans]),
            count("items", _("Items"), [t.items[1] for t in tallies]),
            count("changes", _("Changes"), [t.changes for t in tallies]),
            money("margin", _("Margin a week"), [m and m.plan for m in margins], fine),
            money("margin_change", _("Change in margin"), [m and m.change for m in margins], fine),
            money("margin_low", _("Change in margin, low"), [m and m.low for m in margins], fine),
            money("margin_high", _("Change in margin, high"), [m and m.high for m in margins], fine),
            money("sales", _("Sales a week"), [t.sales.plan for t in tallies], fine),
            money("sales_change", _("Change in sales"), [t.sales.change for t in tallies], fine),
            number("units", _("Units a week"), [t.units.plan for t in tallies], 0),
            number("units_change", _("Change in units"), [t.units.change for t in tallies], 0),
            text("goal", _("Goal"), [plan.limits.goal for plan in plans]),
            text("status", _("Solver"), [o.status if o else _("made by hand") for o in outcomes]),
            percent("gap", _("Gap"), [o.gap if o else None for o in outcomes], 2),
            text("notes", _("Notes"), [plan.notes for plan in plans]),
        ),
        (_("Low and high: 80 % interval of the change against today, on the same draws for every plan."),),
    )
