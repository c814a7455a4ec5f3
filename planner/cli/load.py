"""rangewright load: read the files into a plan file."""

from __future__ import annotations

import argparse
from pathlib import Path

from planner.base.errors import CallError
from planner.base.target_file import check_target
from planner.base.text import _
from planner.cli.answers import load_answer
from planner.cli.common import add_plan, columns, opened, say_load
from planner.cli.output import TerminalProgress, finish
from planner.review import engine
from planner.review.jobs import LoadJob, load_request

OPTIONAL = ("stores", "shoppers", "costs", "ranges", "offers", "successors")


def words() -> str:
    """What the command does."""
    return _("read the files into a plan file, in place of what it holds")


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    parser.add_argument("--sales", required=True, type=Path, metavar="F", help=_("sales history"))
    parser.add_argument("--items", required=True, type=Path, metavar="F", help=_("items with attributes"))
    helps = {
        "stores": _("stores with cluster and shelf space"),
        "shoppers": _("shoppers per store and week"),
        "costs": _("unit costs over time"),
        "ranges": _("which store listed which item when"),
        "offers": _("new items that suppliers offer"),
        "successors": _("items that replaced older codes"),
    }
    for name in OPTIONAL:
        parser.add_argument(f"--{name}", type=Path, metavar="F", help=helps[name])
    parser.add_argument(
        "--match",
        action="extend",
        nargs="+",
        default=[],
        metavar="TABLE.COLUMN=THEIR_NAME",
        help=_("say which of the file's columns is meant"),
    )
    parser.add_argument("--category", default="", metavar="NAME", help=_("the category to review"))
    parser.add_argument(
        "--segment-by",
        type=columns,
        default=(),
        metavar="COLUMN[,COLUMN]",
        help=_("columns that form the segments"),
    )
    parser.add_argument(
        "--set-aside", type=Path, metavar="F.csv", help=_("write the rows that were not used")
    )
    add_plan(parser)


def matches(texts: list[str]) -> tuple[tuple[str, str, str], ...]:
    """table.column=their_name as triples."""
    found = []
    for text in texts:
        left, equals, theirs = text.partition("=")
        table, point, column = left.partition(".")
        if not (equals and point and table and column and theirs):
            raise CallError(
                _("--match {text} cannot be read.").format(text=text),
                remedy=_("Write it as --match sales.units=their_name."),
            )
        found.append((table, column, theirs))
    return tuple(found)


def run(choices: argparse.Namespace) -> int:
    """Do it."""
    progress = TerminalProgress()
    request = load_request(
        {name: getattr(choices, name) for name in ("sales", "items", *OPTIONAL)},
        matches(choices.match),
        choices.category,
        choices.segment_by,
    )
    # Better now than after the reading.
    check_target(choices.plan)
    engine.lock_plan_file(choices.plan).release()
    if choices.set_aside is not None:
        check_target(choices.set_aside, (".csv",))
    with opened() as review:
        review.accept_loaded(engine.run_load(LoadJob(request), progress))
        review.save(choices.plan)
        progress.clear()
        if choices.set_aside is not None:
            engine.write_set_aside(choices.set_aside, review.need_loaded())
        say_load(review)
        finish(load_answer(review.need_loaded()))
    return 0
