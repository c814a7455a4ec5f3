"""rangewright review: everything in one go on a folder."""

from __future__ import annotations

import argparse
import time
from pathlib import Path

from planner.base.target_file import check_target
from planner.base.text import _
from planner.cli.answers import fit_answer, load_answer, plan_answer
from planner.cli.common import add_plan, add_seconds, opened, say_fit, say_load, say_plan
from planner.cli.output import TerminalProgress, finish, say
from planner.cli.recommend import DEFAULT_NAME
from planner.review import engine
from planner.review.jobs import ExportJob, FitJob, RecommendJob


def words() -> str:
    """What the command does."""
    return _("everything in one go: load a folder, fit, find the best plan, write the workbook")


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    parser.add_argument(
        "folder",
        type=Path,
        metavar="FOLDER",
        help=_(
            "holds sales.*, items.* and, where there, stores.*, shoppers.*, costs.*, ranges.*, offers.*, "
            "successors.*"
        ),
    )
    parser.add_argument("--workbook", required=True, type=Path, metavar="OUT.xlsx")
    add_plan(parser, required=False)
    add_seconds(parser)


def run(choices: argparse.Namespace) -> int:
    """Load, fit, recommend, write the workbook."""
    began = time.monotonic()
    # Better now than after the work.
    check_target(choices.workbook, (".xlsx",))
    if choices.plan is not None:
        check_target(choices.plan)
        engine.lock_plan_file(choices.plan).release()
    progress = TerminalProgress()
    with opened() as review:
        review.accept_loaded(engine.run_load(engine.request_from_folder(choices.folder), progress))
        progress.clear()
        say_load(review)
        say("")
        loaded = review.need_loaded()
        review.accept_fitted(engine.run_fit(FitJob(loaded), progress))
        progress.clear()
        say_fit(review)
        say("")
        fitted = review.need_fitted()
        plan = engine.run_recommend(
            RecommendJob(loaded, fitted, review.limits, DEFAULT_NAME, choices.seconds), progress
        )
        review.accept_recommended(plan)
        progress.clear()
        say_plan(review, plan)
        for sentence in review.words("cautions"):
            say(sentence)
        engine.run_export(ExportJob("workbook", choices.workbook, loaded, fitted, plan), progress)
        if choices.plan is not None:
            review.save(choices.plan)
        progress.clear()
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
    return 0
