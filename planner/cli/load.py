"""rangewright load: read the files into a plan file."""

from __future__ import annotations

import argparse
from pathlib import Path

from planner.base.errors import CallError
from planner.base.text import _
from planner.cli.common import add_plan, load_answer, say_load
from planner.cli.output import TerminalProgress, finish
from planner.review import engine
from planner.review.jobs import LoadJob, load_request
from planner.review.review import RangeReview

OPTIONAL = ("stores", "shoppers", "costs", "ranges", "offers", "successors")


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    parser.add_argument("--sales", required=True, type=Path, metavar="F", help=_("sales history"))
    parser.add_argument("--items", required=True, type=Path, metavar="F", help=_("items with attributes"))
    for name in OPTIONAL:
        parser.add_argument(f"--{name}", type=Path, metavar="F")
    parser.add_argument(
        "--match",
        action="append",
        default=[],
        metavar="TABLE.COLUMN=THEIR_NAME",
        help=_("say which of the file's columns is meant; may be repeated"),
    )
    parser.add_argument("--category", default="", metavar="NAME", help=_("the category to review"))
    parser.add_argument(
        "--segment-by", default="", metavar="COLUMN[,COLUMN]", help=_("columns that form segments")
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
        tuple(part for part in choices.segment_by.split(",") if part),
    )
    review = RangeReview()
    review.accept_loaded(engine.run_load(LoadJob(request), progress))
    progress.clear()
    if choices.set_aside is not None:
        engine.write_set_aside(choices.set_aside, review.need_loaded())
    review.save(choices.plan)
    say_load(review)
    finish(load_answer(review.need_loaded()))
    review.close()
    return 0
