"""rangewright transfer: where sales go when items are delisted, listed or repriced, from today."""

from __future__ import annotations

import argparse
from pathlib import Path

from planner.base.errors import CallError
from planner.base.text import _
from planner.cli.common import add_plan, opened, tally_answer
from planner.cli.output import finish, say
from planner.review.effects import change_from_today
from planner.tables.csv import write_csv
from planner.tables.format import percent, table_text
from planner.tables.transfer import transfer_table


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    add_plan(parser)
    parser.add_argument("--delist", action="append", default=[], metavar="ITEM")
    parser.add_argument("--list", action="append", default=[], metavar="ITEM")
    parser.add_argument(
        "--price", action="append", default=[], metavar="ITEM=VALUE", help=_("new regular price")
    )
    parser.add_argument("--cluster", default="", metavar="C", help=_("change in this cluster only"))
    parser.add_argument("--csv", type=Path, metavar="F")


def prices(texts: list[str]) -> dict[str, float]:
    """ITEM=VALUE as a mapping."""
    found = {}
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
        found[item] = price
    return found


def run(choices: argparse.Namespace) -> int:
    """Do it; nothing is written into the plan file."""
    if not (choices.delist or choices.list or choices.price):
        raise CallError(_("Nothing to change."), remedy=_("Give --delist, --list or --price."))
    review = opened(choices.plan)
    change = change_from_today(review, choices.delist, choices.list, prices(choices.price), choices.cluster)
    table = transfer_table(review.need_loaded().catalogue, change.tally.effects, change.changed)
    if choices.csv is not None:
        write_csv(table, choices.csv)
    say(table_text(change.receivers, rows=25))
    leaves = change.leaves
    if leaves is not None:
        say(
            _("Leaves the category: {share} of the units of the changed items.").format(
                share=percent(leaves, 1)
            )
        )
    answer = tally_answer(change.tally)
    answer["leaves"] = leaves
    answer["csv"] = choices.csv
    finish(answer)
    review.close()
    return 0
