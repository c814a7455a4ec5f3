"""rangewright transfer: where sales go when items are delisted, listed or repriced, from today."""

from __future__ import annotations

import argparse
from dataclasses import replace
from pathlib import Path

from planner.base.errors import CallError
from planner.base.target_file import check_target
from planner.base.text import _
from planner.cli.answers import transfer_answer
from planner.cli.common import add_plan, opened
from planner.cli.output import finish, say
from planner.review.effects import ChangeFromToday, change_from_today
from planner.tables.csv import ENDINGS, write_csv
from planner.tables.format import percent, percent_span, table_text
from planner.tables.table import Table

_COLUMNS = ("kind", "item", "description", "before", "after", "change", "low", "high", "share")
# Brands and suppliers stand in the window and the workbook; the terminal shows the main rows.
_SUMS = ("changed", "own label", "leaves")
_MOST_RECEIVERS = 15


def words() -> str:
    """What the command does."""
    return _("where sales go when items are delisted, listed or repriced, from today; writes nothing into P")


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    add_plan(parser)
    for name, help_words in (
        ("--delist", _("take these items off every list")),
        ("--list", _("put these items on every list")),
    ):
        parser.add_argument(name, action="extend", nargs="+", default=[], metavar="ITEM", help=help_words)
    parser.add_argument(
        "--price",
        action="extend",
        nargs="+",
        default=[],
        metavar="ITEM=VALUE",
        help=_("new regular price, VAT included"),
    )
    parser.add_argument("--cluster", metavar="C", help=_("make the change in this cluster only"))
    parser.add_argument("--csv", type=Path, metavar="F")


def prices(texts: list[str]) -> dict[str, float]:
    """ITEM=VALUE as a mapping."""
    found: dict[str, float] = {}
    for text in texts:
        item, equals, value = text.rpartition("=")
        try:
            price = float(value)
        except ValueError:
            price = -1.0
        if not equals or not item or not 0.0 < price < float("inf"):
            raise CallError(
                _("--price {text} cannot be read.").format(text=text),
                remedy=_("Write it as --price ITEM=VALUE with a price above 0 and a decimal point."),
            )
        if item in found:
            raise CallError(_("--price names {item} twice.").format(item=item))
        found[item] = price
    return found


def main_rows(table: Table) -> Table:
    """The changed items, the receivers that gain most, own label, what leaves."""
    kinds = table.column("kind").values
    receivers = [row for row in range(table.n_rows) if kinds[row] == "item"][:_MOST_RECEIVERS]
    rows = [row for row in range(table.n_rows) if kinds[row] in _SUMS or row in receivers]
    picked = tuple(replace(c, values=tuple(c.values[row] for row in rows)) for c in table.columns)
    return replace(table, columns=picked)


def _say_change(change: ChangeFromToday) -> None:
    if not change.changed.any():
        say(_("Nothing changes: the items already stand as wanted."))
        return
    say(table_text(main_rows(change.receivers), _COLUMNS))
    more = sum(kind == "item" for kind in change.receivers.column("kind").values) - _MOST_RECEIVERS
    if more > 0:
        say(_("... and {n} more items; --csv writes all of them.").format(n=more))
    if change.leaves is None:
        return
    share, low, high = change.leaves
    if share >= 0.0:
        said = _("Leaves the category: {share} of the units of the changed items (80 % interval {span}).")
    else:
        said = _("Comes into the category: {share} of the units of the changed items (80 % interval {span}).")
        share, low, high = -share, -high, -low
    say(said.format(share=percent(share, 1), span=percent_span(low, high, 1)))


def run(choices: argparse.Namespace) -> int:
    """Do it; nothing is written into the plan file."""
    if not (choices.delist or choices.list or choices.price):
        raise CallError(_("Nothing to change."), remedy=_("Give --delist, --list or --price."))
    if choices.csv is not None:
        check_target(choices.csv, ENDINGS)
    with opened(choices.plan) as review:
        change = change_from_today(
            review, choices.delist, choices.list, prices(choices.price), choices.cluster
        )
        if choices.csv is not None:
            write_csv(change.transfer, choices.csv)
        _say_change(change)
        finish({**transfer_answer(review, change), "csv": choices.csv})
    return 0
