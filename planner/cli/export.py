"""rangewright export: workbook, report and stores' list of a kept plan."""

from __future__ import annotations

import argparse
from pathlib import Path

from planner.base.errors import CallError
from planner.base.target_file import check_target
from planner.base.text import _
from planner.cli.common import add_plan, opened
from planner.cli.output import TerminalProgress, finish, say
from planner.review import engine
from planner.review.jobs import ExportJob

# Option, kind of export, endings of its file.
OUTPUTS = (
    ("workbook", "workbook", (".xlsx",)),
    ("report", "report", (".pdf",)),
    ("stores_list", "stores list", (".csv", ".txt")),
)


def words() -> str:
    """What the command does."""
    return _("write the workbook, the report or the stores' list of a kept plan")


def add(parser: argparse.ArgumentParser) -> None:
    """Options."""
    add_plan(parser)
    parser.add_argument("--name", metavar="NAME", help=_("the kept plan; else the latest"))
    parser.add_argument("--workbook", type=Path, metavar="F.xlsx")
    parser.add_argument("--report", type=Path, metavar="F.pdf")
    parser.add_argument("--stores-list", type=Path, metavar="F.csv")
    parser.add_argument(
        "--with-costs", action="store_true", help=_("put cost and margin into the stores' list as well")
    )


def run(choices: argparse.Namespace) -> int:
    """Do it."""
    wanted = []
    for option, kind, endings in OUTPUTS:
        path = getattr(choices, option)
        if path is not None:
            check_target(path, endings)
            wanted.append((kind, path))
    if not wanted:
        raise CallError(_("Nothing to write."), remedy=_("Give --workbook, --report or --stores-list."))
    progress = TerminalProgress()
    with opened(choices.plan) as review:
        plan, loaded, fitted = review.plan(choices.name), review.need_loaded(), review.need_fitted()
        for kind, path in wanted:
            # The workbook and the report are for the head office; a stores' list is not.
            costs = choices.with_costs or kind != "stores list"
            engine.run_export(ExportJob(kind, path, loaded, fitted, plan, costs), progress)
            progress.clear()
            say(_("Written: {path}").format(path=path))
        finish({"plan": plan.name, "files": [path for _kind, path in wanted]})
    return 0
