"""The limits of a plan and how much of each the plan uses."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from planner.base.text import _
from planner.plan.limits import ItemLock, Limits
from planner.plan.plans import States
from planner.tables.build import flag, number, text
from planner.tables.names import changed_pairs, cluster_name
from planner.tables.table import Table
from planner.transfer.what_if import OUT, presence, today_states

if TYPE_CHECKING:
    from planner.sales.report import LoadedData


@dataclass(frozen=True)
class _Row:
    """key: stable name; where: cluster or item; limit, used: numbers or None; words: for what has none."""

    key: str
    limit_words: str
    where: str
    limit: float | None = None
    used: float | None = None
    met: bool | None = None
    words: str = ""


def _at_most(key: str, title: str, where: str, limit: float, used: float, words: str = "") -> _Row:
    return _Row(key, title, where, limit, used, used <= limit + 1e-6, words)


def _room(row: _Row) -> float | None:
    if row.limit is None or row.used is None:
        return None
    return row.used - row.limit if row.key == "min_items" else row.limit - row.used


def _space_rows(loaded: LoadedData, limits: Limits, states: States) -> list[_Row]:
    """The stores' own space (always binding) and what the user set, per cluster."""
    base, catalogue = loaded.base, loaded.catalogue
    cluster = np.array(catalogue.cluster_of_store(), dtype=np.int64)
    present = presence(states, base.today, cluster)
    use = present.astype(np.float64) @ base.space_cm
    title = _("Space, cm") if base.space_known else _("Places (today's number of items)")
    rows = []
    for c, name in enumerate(catalogue.clusters):
        stores = np.flatnonzero(cluster == c)
        tight = stores[int(np.argmin(base.space_limit[stores] - use[stores]))]
        words = _("the store with the least room left: {store}").format(store=catalogue.stores[tight].code)
        rows.append(
            _at_most(
                "space", title, cluster_name(name), float(base.space_limit[tight]), float(use[tight]), words
            )
        )
    for limit in limits.clusters:
        if limit.cluster not in catalogue.clusters:
            continue
        c = catalogue.clusters.index(limit.cluster)
        where = cluster_name(limit.cluster)
        count = float((states[c] != OUT).sum())
        if limit.space is not None:
            most = float(use[cluster == c].max())
            words = _("the store that uses most")
            rows.append(_at_most("cluster_space", _("Space at most"), where, limit.space, most, words))
        if limit.min_items is not None:
            rows.append(
                _Row(
                    "min_items", _("Items at least"), where, limit.min_items, count, count >= limit.min_items
                )
            )
        if limit.max_items is not None:
            rows.append(_at_most("max_items", _("Items at most"), where, limit.max_items, count))
    return rows


def _lock_met(lock: ItemLock, states: States, today: States, j: int, clusters: Sequence[int]) -> bool:
    mine, now = states[clusters, j], today[clusters, j]
    if lock.kind == "keep":
        # A keep for every cluster asks for nothing where the item is not listed today.
        waived = (now == OUT) & (not lock.cluster) & bool((now != OUT).any())
        return bool(((mine != OUT) | waived).all())
    if lock.kind == "never":
        return bool((mine == OUT).all())
    return bool((mine == now).all())


def _lock_rows(loaded: LoadedData, limits: Limits, states: States) -> list[_Row]:
    catalogue = loaded.catalogue
    index = catalogue.item_index()
    cluster = np.array(catalogue.cluster_of_store(), dtype=np.int64)
    today = today_states(loaded.base.today, cluster, len(catalogue.clusters))
    titles = {"keep": _("Keep"), "never": _("Never list"), "as today": _("Leave as today")}
    flags = tuple(
        ItemLock(item.code, "keep", reason=_("keep flag of the items table"))
        for item in catalogue.items
        if item.keep
    )
    rows = []
    for lock in (*limits.locks, *flags):
        where = lock.item if not lock.cluster else f"{lock.item}, {lock.cluster}"
        met = None
        if lock.item in index and (not lock.cluster or lock.cluster in catalogue.clusters):
            every = range(len(catalogue.clusters))
            picked = [catalogue.clusters.index(lock.cluster)] if lock.cluster else list(every)
            met = _lock_met(lock, states, today, index[lock.item], picked)
        until = _("until {day}").format(day=lock.until) if lock.until else ""
        words = "; ".join(part for part in (lock.reason, until) if part)
        rows.append(_Row("lock", titles.get(lock.kind, lock.kind), where, met=met, words=words))
    return rows


def limits_table(loaded: LoadedData, limits: Limits, states: States) -> Table:
    """Every limit, what the plan ``states`` (C, J) uses of it, and whether it is met."""
    catalogue = loaded.catalogue
    cluster = np.array(catalogue.cluster_of_store(), dtype=np.int64)
    changes = float(changed_pairs(loaded.base.today, cluster, states).sum())
    goals = {"margin": _("category margin"), "sales": _("sales"), "units": _("units")}
    rows = [_Row("goal", _("Goal"), "", words=goals.get(limits.goal, limits.goal))]
    if limits.max_changes is not None:
        rows.append(_at_most("max_changes", _("Changes at most"), "", limits.max_changes, changes))
    else:
        rows.append(_Row("max_changes", _("Changes"), "", None, changes, words=_("no limit")))
    for key, title, cost in (
        ("listing_cost", _("Cost per listing a week"), limits.listing_cost),
        ("delisting_cost", _("Cost per delisting a week"), limits.delisting_cost),
    ):
        if cost:
            rows.append(_Row(key, title, "", cost))
    rows += _space_rows(loaded, limits, states)
    rows += _lock_rows(loaded, limits, states)
    room = [_room(row) for row in rows]
    return Table(
        "limits",
        _("Limits"),
        (
            text("limit", _("Limit"), [row.limit_words for row in rows]),
            text("where", _("Where"), [row.where for row in rows]),
            number("value", _("Value"), [row.limit for row in rows], 2),
            number("used", _("Used by the plan"), [row.used for row in rows], 2),
            number("room", _("Room"), room, 2),
            flag("met", _("Met"), [row.met for row in rows]),
            text("words", _("Remark"), [row.words for row in rows]),
            text("key", _("Key"), [row.key for row in rows]),
        ),
    )
