"""What was loaded: the reconciliation, the checks, the column matches, the listing events."""

from __future__ import annotations

from collections import defaultdict
from datetime import date
from decimal import Decimal
from typing import TYPE_CHECKING

import numpy as np

from planner.base.text import _
from planner.tables.table import Column, Table

if TYPE_CHECKING:
    from planner.sales.report import Check, LoadedData, LoadReport

# Weeks of sales by which an event's money is judged.
_EVENT_WEEKS = 8


def _share(part: Decimal, whole: Decimal) -> float | None:
    return float(part / whole) if whole else None


def reconciliation_table(report: LoadReport) -> Table:
    """Rows and money read, used and set aside per reason; exact money (Decimal)."""
    aside = [check for check in report.checks if check.set_aside]
    left = report.money_read - report.money_used - sum((check.money for check in aside), Decimal(0))
    rows: list[tuple[str, int, Decimal]] = [(_("Read"), report.rows_read, report.money_read)]
    rows += [(_("Set aside: {reason}").format(reason=c.title), c.rows, c.money) for c in aside]
    rows.append((_("Used"), report.rows_used, report.money_used))
    if left == 0:
        said = _("Money read equals money used plus money set aside, to the smallest unit.")
    else:
        said = _("Money read differs from money used plus money set aside by {left}.").format(left=left)
    return Table(
        "reconciliation",
        _("Reconciliation"),
        (
            Column("what", _("What"), "text", tuple(row[0] for row in rows)),
            Column("rows", _("Rows"), "count", tuple(row[1] for row in rows)),
            Column("money", _("Money"), "money", tuple(row[2] for row in rows), decimals=2),
            Column(
                "share",
                _("Share of money"),
                "percent",
                tuple(_share(row[2], report.money_read) for row in rows),
                decimals=2,
            ),
        ),
        (said,),
    )


def _example(check: Check, most: int | None) -> str:
    places = []
    for file, row, text in check.examples[:most]:
        place = _("{file} row {row}").format(file=file, row=row) if row > 0 else file
        places.append(_("{place}: {text}").format(place=place, text=text) if text else place)
    return "; ".join(places)


def checks_table(report: LoadReport, examples: int | None = None) -> Table:
    """Every check that found something: count, money, what was done, first rows as examples.

    examples: how many of each, None for all that were kept.
    """
    checks = report.checks
    return Table(
        "checks",
        _("Checks of the rows"),
        (
            Column("check", _("Check"), "text", tuple(c.title for c in checks)),
            Column("rows", _("Rows"), "count", tuple(c.rows for c in checks)),
            Column("money", _("Money"), "money", tuple(c.money for c in checks), decimals=2),
            Column(
                "share",
                _("Share of money"),
                "percent",
                tuple(_share(c.money, report.money_read) for c in checks),
                decimals=2,
            ),
            Column("set_aside", _("Set aside"), "flag", tuple(c.set_aside for c in checks)),
            Column("treatment", _("What was done"), "text", tuple(c.treatment for c in checks)),
            Column("examples", _("Examples"), "text", tuple(_example(c, examples) for c in checks)),
            Column("code", _("Code"), "text", tuple(c.code for c in checks)),
        ),
        () if checks else (_("No check found anything."),),
    )


def matches_table(report: LoadReport) -> Table:
    """Which column of the files was taken for which of ours."""
    return Table(
        "matches",
        _("Columns"),
        (
            Column("table", _("Table"), "text", tuple(m[0] for m in report.matches)),
            Column("column", _("Column"), "text", tuple(m[1] for m in report.matches)),
            Column("their_name", _("Name in the file"), "text", tuple(m[2] for m in report.matches)),
        ),
    )


def _event_money(loaded: LoadedData, item: int, week: int, kind: str, stores: set[int]) -> float:
    """Money a week of the item in the event's stores, in the weeks when it was listed next to the event."""
    panel = loaded.panel
    first, last = (week, week + _EVENT_WEEKS) if kind == "listed" else (week - _EVENT_WEEKS, week)
    near = (panel.week_index >= first) & (panel.week_index < last)
    near &= np.isin(panel.store_index, list(stores)) & panel.listed[:, item]
    weeks = np.unique(panel.week_index[near]).size
    if weeks == 0:
        return 0.0
    return float((panel.units[near, item] * panel.price[near, item]).sum() / weeks)


def events_table(loaded: LoadedData, top: int | None = None) -> Table:
    """Listings and delistings, stores of one week together, largest money first; top: only so many."""
    items, stores = loaded.catalogue.item_index(), loaded.catalogue.store_index()
    position = {day: w for w, day in enumerate(loaded.panel.weeks)}
    groups: dict[tuple[str, date, str], set[int]] = defaultdict(set)
    for event in loaded.report.events:
        if event.item in items and event.store in stores and event.week in position:
            groups[event.item, event.week, event.kind].add(stores[event.store])
    found = [
        (_event_money(loaded, items[code], position[week], kind, where), code, week, kind, where)
        for (code, week, kind), where in groups.items()
    ]
    found.sort(key=lambda row: (-row[0], row[1], row[2], row[3]))
    found = found if top is None else found[:top]
    records = [loaded.catalogue.items[items[row[1]]] for row in found]
    words = {"listed": _("listed"), "delisted": _("delisted")}
    cluster = loaded.catalogue.cluster_of_store()
    names = loaded.catalogue.clusters
    return Table(
        "events",
        _("Listing events"),
        (
            Column("week", _("Week from"), "text", tuple(row[2] for row in found)),
            Column("item", _("Item"), "text", tuple(row[1] for row in found)),
            Column("description", _("Description"), "text", tuple(i.description for i in records)),
            Column("segment", _("Segment"), "text", tuple(i.segment for i in records)),
            Column("kind", _("What happened"), "text", tuple(words.get(r[3], r[3]) for r in found)),
            Column("stores", _("Stores"), "count", tuple(len(row[4]) for row in found)),
            Column(
                "clusters",
                _("Clusters"),
                "text",
                tuple(", ".join(sorted({names[cluster[s]] for s in row[4]})) for row in found),
            ),
            Column("money", _("Money a week"), "money", tuple(row[0] for row in found), decimals=2),
        ),
        (
            _(
                "Money: the item's sales in these stores, in up to {n} weeks after a listing or before "
                "a delisting."
            ).format(n=_EVENT_WEEKS),
        ),
    )
