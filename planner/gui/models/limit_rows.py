"""The limits per cluster and the locks as tables to edit, and back into limits."""

from __future__ import annotations

from dataclasses import replace

from PySide6.QtCore import QLocale

from planner.base.errors import CallError
from planner.base.text import _
from planner.catalogue.items import Catalogue
from planner.plan.limits import ClusterLimit, ItemLock, Limits
from planner.tables.table import Column, Table

LOCK_KINDS = ("keep", "never", "as today")


def lock_words() -> dict[str, str]:
    """Kinds of lock in words."""
    return {"keep": _("keep"), "never": _("never list"), "as today": _("leave as today")}


def cluster_rows(catalogue: Catalogue, limits: Limits, space_known: bool) -> Table:
    """One row per cluster: space set by the user, fewest and most items; empty: no such limit."""
    known = {limit.cluster: limit for limit in limits.clusters}
    rows = [known.get(name, ClusterLimit(name)) for name in catalogue.clusters]
    stores = [sum(store.cluster == name for store in catalogue.stores) for name in catalogue.clusters]
    unit = _("cm") if space_known else _("places")
    return Table(
        "cluster_limits",
        _("Limits per cluster"),
        (
            Column("cluster", _("Cluster"), "text", [row.cluster for row in rows]),
            Column("stores", _("Stores"), "count", stores),
            Column("space", _("Space at most"), "number", [row.space for row in rows], unit),
            Column("min_items", _("Items at least"), "count", [row.min_items for row in rows]),
            Column("max_items", _("Items at most"), "count", [row.max_items for row in rows]),
        ),
    )


def with_cluster_value(limits: Limits, cluster: str, key: str, text: str) -> Limits:
    """The limits after one cell was typed.  Raises CallError for what is no number >= 0."""
    value: float | int | None = None
    if text:
        number, valid = QLocale().toDouble(text)
        whole = key != "space"
        if not valid or number < 0.0 or (whole and number != int(number)):
            expected = _("a whole number, 0 or more") if whole else _("a number, 0 or more")
            raise CallError(
                _("“{text}” is not {expected}.").format(text=text, expected=expected),
                place=_("limit of cluster {cluster}").format(cluster=cluster or _("all stores")),
                remedy=_("Type a number, or empty the cell for no limit."),
            )
        value = int(number) if whole else number
    rows = {limit.cluster: limit for limit in limits.clusters}
    row = rows.get(cluster, ClusterLimit(cluster))
    space, fewest, most = row.space, row.min_items, row.max_items
    if key == "space":
        space = value
    elif key == "min_items":
        fewest = None if value is None else int(value)
    else:
        most = None if value is None else int(value)
    rows[cluster] = ClusterLimit(cluster, space, fewest, most)
    kept = tuple(r for r in rows.values() if r != ClusterLimit(r.cluster))
    return replace(limits, clusters=kept)


def lock_key(lock: ItemLock) -> str:
    """What tells locks apart."""
    return f"{lock.item}\n{lock.cluster}"


def lock_rows(catalogue: Catalogue, limits: Limits) -> Table:
    """One row per lock."""
    names = {item.code: item.description for item in catalogue.items}
    words, locks = lock_words(), limits.locks
    return Table(
        "locks",
        _("Locks"),
        (
            Column("key", "", "text", [lock_key(lock) for lock in locks]),
            Column("rule", _("Rule"), "text", [words.get(lock.kind, lock.kind) for lock in locks]),
            Column("item", _("Item"), "text", [names.get(lock.item) or lock.item for lock in locks]),
            Column("cluster", _("Cluster"), "text", [lock.cluster or _("all") for lock in locks]),
            Column("reason", _("Reason"), "text", [lock.reason for lock in locks]),
            Column("until", _("Until"), "text", [lock.until for lock in locks]),
        ),
    )
