"""rangewright fit: fit the share model of a plan file."""

from __future__ import annotations

import argparse
import sys

from planner.base.errors import CallError
from planner.base.text import _
from planner.cli.common import add_plan, fit_answer, opened
from planner.cli.output import TerminalProgress, finish, say
from planner.review import engine
from planner.review.jobs import FitJob, LoadJob, request_with_segments


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    add_plan(parser)
    parser.add_argument("--model", choices=("nested", "plain"), default="nested", help=_("the share model"))
    parser.add_argument(
        "--segment-by", default="", metavar="COLUMN[,COLUMN]", help=_("form other segments first")
    )
    parser.add_argument(
        "--draws", type=int, default=200, metavar="R", help=_("parameter draws for intervals")
    )
    parser.add_argument("--seed", type=int, default=1, metavar="N")


def run(choices: argparse.Namespace) -> int:
    """Do it."""
    if choices.draws < 20:
        raise CallError(
            _("--draws {n} is too few for an 80 % interval.").format(n=choices.draws),
            remedy=_("Use at least 20."),
        )
    review = opened(choices.plan)
    progress = TerminalProgress()
    columns = tuple(part for part in choices.segment_by.split(",") if part)
    if columns:
        request = request_with_segments(review.need_loaded().request, columns)
        review.accept_loaded(engine.run_load(LoadJob(request), progress))
    fitted = engine.run_fit(
        FitJob(review.need_loaded(), choices.model, choices.seed, choices.draws), progress
    )
    progress.clear()
    review.accept_fitted(fitted)
    review.save()
    for words in review.words("evidence"):
        say(words)
    for note in fitted.notes:
        print(note, file=sys.stderr)
    finish(fit_answer(review))
    review.close()
    return 0
