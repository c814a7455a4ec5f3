"""rangewright recommend: the best assortment with a proven bound, kept as a named plan."""

from __future__ import annotations

import argparse
from dataclasses import replace
from pathlib import Path

from planner.base.errors import CallError
from planner.base.text import _
from planner.cli.common import add_plan, opened, plan_answer, say_plan
from planner.cli.output import TerminalProgress, finish
from planner.plan.limits import GOALS
from planner.plan.toml import read_limits
from planner.review import engine
from planner.review.jobs import RecommendJob
from planner.tables.csv import write_csv
from planner.tables.plan import plan_table

DEFAULT_NAME = "best plan"


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    add_plan(parser)
    parser.add_argument(
        "--limits", type=Path, metavar="F.toml", help=_("limits; else those of the plan file")
    )
    parser.add_argument("--changes", type=int, metavar="N", help=_("at most N changes against today"))
    parser.add_argument("--goal", choices=GOALS, help=_("what to make as large as possible"))
    parser.add_argument("--seconds", type=float, default=20.0, metavar="S", help=_("time allowed (20)"))
    parser.add_argument(
        "--gap", type=float, default=1e-3, metavar="G", help=_("relative gap to prove (0.001)")
    )
    parser.add_argument("--name", default=DEFAULT_NAME, metavar="NAME", help=_("name of the plan"))
    parser.add_argument("--csv", type=Path, metavar="F")


def run(choices: argparse.Namespace) -> int:
    """Do it; today is left untouched."""
    for name, value, least in (("--changes", choices.changes, 0), ("--gap", choices.gap, 0.0)):
        if value is not None and not value >= least:
            raise CallError(_("{name} {value} is below {least}.").format(name=name, value=value, least=least))
    if not choices.seconds > 0.0:
        raise CallError(_("--seconds must be above 0."))
    review = opened(choices.plan)
    limits = read_limits(choices.limits) if choices.limits is not None else review.limits
    if choices.changes is not None:
        limits = replace(limits, max_changes=choices.changes)
    if choices.goal is not None:
        limits = replace(limits, goal=choices.goal)
    progress = TerminalProgress()
    job = RecommendJob(
        review.need_loaded(), review.need_fitted(), limits, choices.name, choices.seconds, choices.gap
    )
    plan = engine.run_recommend(job, progress)
    progress.clear()
    review.accept_recommended(plan)
    review.save()
    if choices.csv is not None:
        write_csv(
            plan_table(review.need_loaded(), review.single_effects(plan.states), plan.states), choices.csv
        )
    say_plan(review, plan)
    finish(plan_answer(review, plan))
    review.close()
    return 0
