"""Options and words that several commands share."""

from __future__ import annotations

import argparse
from collections import Counter
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

from planner.base.text import _
from planner.cli.output import say
from planner.review.review import RangeReview
from planner.tables.format import number, percent, sensible_decimals, span, table_text
from planner.tables.names import ACTIONS, cluster_name
from planner.tables.plan import action_word, item_list_table
from planner.tables.words import beyond_history

if TYPE_CHECKING:
    from planner.plan.plans import NamedPlan

# A plan with no more changes than this is told change by change.
FEW_CHANGES = 20


def add_plan(parser: argparse.ArgumentParser, required: bool = True) -> None:
    """The --plan option."""
    parser.add_argument("--plan", required=required, type=Path, metavar="P", help=_("the plan file"))


def add_seconds(parser: argparse.ArgumentParser) -> None:
    """The --seconds option."""
    parser.add_argument(
        "--seconds",
        type=amount(0.0, above=True),
        default=20.0,
        metavar="S",
        help=_("time allowed for the search (20)"),
    )


def columns(text: str) -> tuple[str, ...]:
    """COLUMN[,COLUMN] of --segment-by."""
    return tuple(part.strip() for part in text.split(",") if part.strip())


def whole(least: int) -> Callable[[str], int]:
    """Reads a whole number of at least ``least``."""

    def read(text: str) -> int:
        try:
            value = int(text)
        except ValueError:
            value = least - 1
        if value < least:
            raise argparse.ArgumentTypeError(
                _("'{text}' is not a whole number of {least} or more").format(text=text, least=least)
            )
        return value

    return read


def amount(least: float, above: bool = False) -> Callable[[str], float]:
    """Reads a finite number of at least (or above) ``least``, with a decimal point."""

    def read(text: str) -> float:
        try:
            value = float(text)
        except ValueError:
            value = float("nan")
        if not (least < value if above else least <= value) or value == float("inf"):
            words = _("'{text}' is not a number above {least}") if above else _("'{text}' is below {least}")
            raise argparse.ArgumentTypeError(words.format(text=text, least=f"{least:g}"))
        return value

    return read


@contextmanager
def opened(path: Path | None = None) -> Iterator[RangeReview]:
    """A review, with this plan file open if one is given; the file is let go at the end."""
    review = RangeReview()
    try:
        if path is not None:
            review.open(path)
        yield review
    finally:
        review.close()


def say_load(review: RangeReview) -> None:
    """What was read and reconciled, and what was assumed."""
    loaded = review.need_loaded()
    say(table_text(review.table("reconciliation")))
    for check in loaded.report.checks:
        say(f"  {check.title}: {check.rows} ({check.treatment})")
    for note in (*loaded.report.notes, *loaded.base.notes):
        say(f"  {note}")


def say_fit(review: RangeReview, keys: tuple[str, ...] = ("model",)) -> None:
    """The model in words, and what the fit could not do."""
    for key in keys:
        for sentence in review.words(key):
            say(sentence)
    for note in review.need_fitted().notes:
        say(note)


def say_plan(review: RangeReview, plan: NamedPlan) -> None:
    """What a plan changes and what it is worth: the estimate first, the solver's gap second."""
    say_changes(review, plan)
    tally = review.single_tally(plan.states)
    for key, title, figure in (
        ("margin", _("Category margin a week"), tally.margin),
        ("sales", _("Sales a week, without VAT"), tally.sales),
        ("units", _("Units a week"), tally.units),
    ):
        if key == "margin" and not review.has_costs():
            continue
        fine = sensible_decimals([figure.change, figure.low, figure.high])
        say(
            _("{title}: {today} today, estimated change {change}, 80 % interval {span}.").format(
                title=title,
                today=number(figure.today, fine),
                change=number(figure.change, fine, True),
                span=span(figure.low, figure.high, fine, True),
            )
        )
    beyond = beyond_history(review.need_loaded(), plan.states)
    if beyond:
        say(beyond)
    outcome = plan.outcome
    if outcome is not None:
        fine = max(sensible_decimals([outcome.value]), 1)
        say(
            _(
                "Best plan found {value}; under this model no plan within the limits is worth more than "
                "{bound} ({status}, gap {gap}, {seconds} s)."
            ).format(
                value=number(outcome.value, fine),
                bound=number(outcome.bound, fine),
                status=outcome.status,
                gap=percent(outcome.gap, 2),
                seconds=number(outcome.seconds, 1),
            )
        )
    if plan.notes:
        say(plan.notes)


def say_changes(review: RangeReview, plan: NamedPlan) -> None:
    """Actions counted per cluster, and one by one when they are few."""
    loaded = review.need_loaded()
    table = item_list_table(loaded, review.single_effects(plan.states), plan.states)
    keep = action_word("keep")
    rows = [row for row in range(table.n_rows) if table.column("action").values[row] != keep]
    cluster, action = table.column("cluster").values, table.column("action").values
    say(_("Plan '{name}': {n} changes against today.").format(name=plan.name, n=len(rows)))
    for name in map(cluster_name, loaded.catalogue.clusters):
        counts = Counter(action[row] for row in rows if cluster[row] == name)
        parts = [f"{counts[action_word(word)]} {action_word(word)}" for word in ACTIONS[:-1]]
        shown = ", ".join(part for part in parts if not part.startswith("0 "))
        say(f"  {name}: {shown or _('nothing changes')}")
    if len(rows) <= FEW_CHANGES:
        item, description = table.column("item").values, table.column("description").values
        for row in rows:
            say(f"  {cluster[row]}: {action[row]} {item[row]} {description[row]}".rstrip())
