"""rangewright recommend: the best assortment with a proven bound, kept as a named plan."""

from __future__ import annotations

import argparse
from dataclasses import replace
from pathlib import Path

from planner.base.errors import CallError
from planner.base.target_file import check_target
from planner.base.text import _
from planner.cli.answers import plan_answer
from planner.cli.common import add_plan, add_seconds, amount, opened, say_plan, whole
from planner.cli.output import TerminalProgress, finish
from planner.plan.limits import GOALS, Limits
from planner.plan.toml import read_limits
from planner.review import engine
from planner.review.jobs import RecommendJob
from planner.review.review import RangeReview
from planner.tables.csv import ENDINGS, write_csv
from planner.tables.plan import plan_table

DEFAULT_NAME = "best plan"


def words() -> str:
    """What the command does."""
    return _("find the best assortment with a proven bound and keep it under a name")


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    add_plan(parser)
    parser.add_argument(
        "--limits", type=Path, metavar="F.toml", help=_("limits; else those of the plan file")
    )
    parser.add_argument("--changes", type=whole(0), metavar="N", help=_("at most N changes against today"))
    parser.add_argument("--goal", choices=GOALS, help=_("what to make as large as possible (margin)"))
    add_seconds(parser)
    parser.add_argument(
        "--gap", type=amount(0.0), default=1e-3, metavar="G", help=_("relative gap to prove (0.001)")
    )
    parser.add_argument("--name", default=DEFAULT_NAME, metavar="NAME", help=_("name of the plan"))
    parser.add_argument("--csv", type=Path, metavar="F")


def limits_of(choices: argparse.Namespace, review: RangeReview) -> Limits:
    """The plan file's limits or those of --limits, with --changes and --goal on top."""
    limits = read_limits(choices.limits) if choices.limits is not None else review.limits
    if choices.changes is not None:
        limits = replace(limits, max_changes=choices.changes)
    if choices.goal is not None:
        limits = replace(limits, goal=choices.goal)
    return limits


def run(choices: argparse.Namespace) -> int:
    """Do it; today is left untouched."""
    if not choices.name.strip():
        raise CallError(_("--name is empty."), remedy=_("Give the plan a name."))
    if choices.csv is not None:
        check_target(choices.csv, ENDINGS)
    progress = TerminalProgress()
    with opened(choices.plan) as review:
        loaded, fitted = review.need_loaded(), review.need_fitted()
        job = RecommendJob(
            loaded, fitted, limits_of(choices, review), choices.name, choices.seconds, choices.gap
        )
        plan = engine.run_recommend(job, progress)
        review.accept_recommended(plan)
        review.save()
        progress.clear()
        if choices.csv is not None:
            write_csv(plan_table(loaded, review.single_effects(plan.states), plan.states), choices.csv)
        say_plan(review, plan)
        finish(plan_answer(review, plan))
    return 0
