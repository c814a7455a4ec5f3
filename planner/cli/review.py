"""rangewright review: everything in one go on a folder."""

from __future__ import annotations

import argparse
import time
from pathlib import Path

from planner.base.text import _
from planner.cli.common import add_plan, fit_answer, load_answer, plan_answer, say_load, say_plan
from planner.cli.output import TerminalProgress, finish, say
from planner.cli.recommend import DEFAULT_NAME
from planner.review import engine
from planner.review.jobs import ExportJob, FitJob, RecommendJob
from planner.review.review import RangeReview


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    parser.add_argument("folder", type=Path, metavar="FOLDER", help=_("holds sales.*, items.* and more"))
    parser.add_argument("--workbook", required=True, type=Path, metavar="OUT.xlsx")
    add_plan(parser, required=False)
    parser.add_argument("--seconds", type=float, default=20.0, metavar="S", help=_("for the best plan (20)"))


def run(choices: argparse.Namespace) -> int:
    """Load, fit, recommend, write the workbook."""
    began = time.monotonic()
    progress = TerminalProgress()
    review = RangeReview()
    review.accept_loaded(engine.run_load(engine.request_from_folder(choices.folder), progress))
    progress.clear()
    say_load(review)
    loaded = review.need_loaded()
    review.accept_fitted(engine.run_fit(FitJob(loaded), progress))
    progress.clear()
    say("")
    for words in review.words("evidence"):
        say(words)
    fitted = review.need_fitted()
    plan = engine.run_recommend(
        RecommendJob(loaded, fitted, review.limits, DEFAULT_NAME, choices.seconds), progress
    )
    progress.clear()
    review.accept_recommended(plan)
    say("")
    say_plan(review, plan)
    for words in review.words("cautions"):
        say(words)
    engine.run_export(ExportJob("workbook", choices.workbook, loaded, fitted, plan), progress)
    progress.clear()
    if choices.plan is not None:
        review.save(choices.plan)
    say("")
    say(_("The workbook is {path}.").format(path=choices.workbook.resolve()))
    finish(
        {
            "load": load_answer(loaded),
            "fit": fit_answer(review),
            "plan": plan_answer(review, plan),
            "workbook": choices.workbook,
            "plan_file": choices.plan,
            "seconds": round(time.monotonic() - began, 3),
        }
    )
    review.close()
    return 0
