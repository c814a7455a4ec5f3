"""The item list cut to what changes."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

from planner.base.text import _
from planner.catalogue.items import Catalogue
from planner.gui.models.answer_words import status_words
from planner.gui.theme import numbers
from planner.plan.plans import NamedPlan
from planner.tables.names import STATE_WORDS, cluster_name
from planner.tables.table import Column, Table


def only_changes(items: Table) -> Table:
    """The rows of the table "items" whose action is not keep, with a key of cluster and item."""
    keep = _("keep")
    rows = [row for row, action in enumerate(items.column("action").values) if action != keep]
    columns = [replace(column, values=tuple(column.values[row] for row in rows)) for column in items.columns]
    clusters, codes = items.column("cluster").values, items.column("item").values
    key = Column("key", "", "text", tuple(f"{clusters[row]}\n{codes[row]}" for row in rows))
    return Table("changes", _("What changes"), (*columns, key), items.notes)


def key_parts(key: str) -> tuple[str, str]:
    """(cluster as shown, item code) of a key."""
    cluster, _line, item = key.partition("\n")
    return cluster, item


def plans_differ(catalogue: Catalogue, first: NamedPlan, other: NamedPlan) -> Table:
    """Items whose state differs between two plans, per cluster."""
    different = [
        (c, j)
        for c in range(len(catalogue.clusters))
        for j in range(len(catalogue.items))
        if first.states[c, j] != other.states[c, j]
    ]
    items = [catalogue.items[j] for _c, j in different]
    clusters = [cluster_name(catalogue.clusters[c]) for c, _j in different]

    def states(plan: NamedPlan) -> tuple[str, ...]:
        return tuple(STATE_WORDS[int(plan.states[c, j])] for c, j in different)

    return Table(
        "difference",
        _("Where two plans differ"),
        (
            Column("cluster", _("Cluster"), "text", clusters),
            Column("item", _("Item"), "text", [item.code for item in items]),
            Column("description", _("Description"), "text", [item.description for item in items]),
            Column("segment", _("Segment"), "text", [item.segment for item in items]),
            Column("first", first.name, "text", states(first)),
            Column("other", other.name, "text", states(other)),
        ),
    )


def plans_in_words(plans: Table, present: str) -> Table:
    """The table "plans" with times, goals and the solver's status as people write them.

    present: name of the plan in work, which has no time of its own.
    """
    names = plans.column("name").values
    goals = {"margin": _("margin"), "sales": _("sales"), "units": _("units")}
    said = {
        "created": lambda value: numbers.moment(str(value)),
        "goal": lambda value: goals.get(str(value), str(value)),
        "status": lambda value: status_words(str(value)),
    }
    columns = [
        replace(column, values=_said(column, names, said[column.key], present))
        if column.key in said
        else column
        for column in plans.columns
    ]
    return Table(plans.key, plans.title, tuple(columns), plans.notes)


def _said(column: Column, names: Sequence[object], words: Callable[[object], str], present: str) -> list[str]:
    texts = [words(value) for value in column.values]
    if column.key != "created":
        return texts
    return ["" if name == present else text for name, text in zip(names, texts, strict=True)]
