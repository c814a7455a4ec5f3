"""rangewright fit: fit the share model of a plan file."""

from __future__ import annotations

import argparse

from planner.base.text import _
from planner.cli.answers import fit_answer
from planner.cli.common import add_plan, columns, opened, say_fit, whole
from planner.cli.output import TerminalProgress, finish
from planner.review import engine
from planner.review.jobs import FitJob

# Fewer parameter draws give no 80 % interval worth the name.
LEAST_DRAWS = 20


def words() -> str:
    """What the command does."""
    return _("fit the share model and store it in the plan file")


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    add_plan(parser)
    parser.add_argument(
        "--model", choices=("nested", "plain"), default="nested", help=_("the share model (nested)")
    )
    parser.add_argument(
        "--segment-by",
        type=columns,
        default=(),
        metavar="COLUMN[,COLUMN]",
        help=_("read the files again with other segments first"),
    )
    parser.add_argument(
        "--draws",
        type=whole(LEAST_DRAWS),
        default=200,
        metavar="R",
        help=_("parameter draws behind the intervals (200)"),
    )
    parser.add_argument("--seed", type=whole(0), default=1, metavar="N", help=_("of the parameter draws (1)"))


def run(choices: argparse.Namespace) -> int:
    """Do it."""
    progress = TerminalProgress()
    with opened(choices.plan) as review:
        if choices.segment_by:
            review.accept_loaded(engine.run_load_again(review.need_loaded(), choices.segment_by, progress))
        job = FitJob(review.need_loaded(), choices.model, choices.seed, choices.draws)
        review.accept_fitted(engine.run_fit(job, progress))
        review.save()
        progress.clear()
        say_fit(review, ("model", "evidence"))
        finish(fit_answer(review))
    return 0
