"""The workbook that others act on."""

from __future__ import annotations

import io
from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path

import numpy as np
from openpyxl import Workbook
from openpyxl.drawing.image import Image
from openpyxl.worksheet.worksheet import Worksheet

from planner import __version__
from planner.base.target_file import replacing
from planner.base.text import _
from planner.demand.fitted import FittedModel
from planner.evidence.history import history
from planner.export import words
from planner.export.chart import chart_height, receivers_chart
from planner.export.meanings import meaning, model_words
from planner.export.sheet import SheetWriter, font
from planner.figures.ladder import ladder_figure
from planner.figures.receivers import largest_rows, receivers_figure
from planner.figures.style import png_of
from planner.plan.plans import NamedPlan
from planner.sales.report import LoadedData
from planner.tables.bench import bench_table
from planner.tables.build import count, number, text
from planner.tables.ladder import ladder_table
from planner.tables.limits import limits_table
from planner.tables.names import ACTIONS, changed_pairs
from planner.tables.plan import action_word, cluster_of, item_list_table
from planner.tables.receivers import receivers_table
from planner.tables.sales import checks_table, matches_table, reconciliation_table
from planner.tables.table import Column, Table
from planner.tables.tally import tally_table
from planner.tables.words import cautions, evidence_words, notes
from planner.transfer.delistings import DelistingTransfers, delistings
from planner.transfer.tally import Tally, tally

ENDINGS = (".xlsx",)
# Columns that tell cost or margin.
_COSTLY = frozenset({"margin", "margin_lost", "margin_lost_low", "margin_lost_high"})
# Rows of the limits and checks that do.
_COSTLY_LIMITS = frozenset({"listing_cost", "delisting_cost"})
_COSTLY_CHECKS = frozenset({"cost_above_price"})
_CHART_ROWS = 16


@dataclass(frozen=True)
class _Review:
    """Everything the sheets are made from; computed once."""

    loaded: LoadedData
    fitted: FittedModel
    plan: NamedPlan
    tally: Tally
    delistings: DelistingTransfers
    receivers: Table
    with_costs: bool

    @property
    def margin_told(self) -> bool:
        """Margin figures may be shown and exist."""
        return self.with_costs and words.has_costs(self.loaded)

    @property
    def value_told(self) -> bool:
        """The goal's own value may be shown."""
        return self.with_costs or self.plan.limits.goal != "margin"


def _reviewed(loaded: LoadedData, fitted: FittedModel, plan: NamedPlan, with_costs: bool) -> _Review:
    figures = tally(fitted, loaded.base, plan.states)
    changed = changed_pairs(loaded.base.today, cluster_of(loaded), plan.states)
    receivers = receivers_table(loaded, figures.effects, changed=changed)
    transfers = delistings(fitted, loaded.base)
    return _Review(loaded, fitted, plan, figures, transfers, receivers, with_costs)


def write_workbook(
    path: Path, loaded: LoadedData, fitted: FittedModel, plan: NamedPlan, with_costs: bool = True
) -> None:
    """Write the workbook of one plan, in place of an earlier file in one step.

    with_costs: False leaves out every cost and margin figure.  Raises CallError when the target
    cannot be written.
    """
    with replacing(path, ENDINGS) as part:
        build_workbook(loaded, fitted, plan, with_costs).save(part)


def build_workbook(
    loaded: LoadedData, fitted: FittedModel, plan: NamedPlan, with_costs: bool = True
) -> Workbook:
    """The workbook in memory."""
    review = _reviewed(loaded, fitted, plan, with_costs)
    book = Workbook()
    book.remove(book.active)
    book.properties.creator = f"Rangewright {__version__}"
    book.properties.title = plan.name
    book.properties.created = _moment(plan.created)
    shown: list[tuple[str, Table]] = []
    for title, fill in (
        (_("Summary"), _summary),
        (_("Item list"), _items),
        (_("Where sales go"), _where),
        (_("Single delistings"), _bench),
        (_("Ladder"), _ladder),
        (_("Limits"), _limits),
        (_("Sales data"), _sales),
    ):
        if fill is _ladder and not (plan.rungs and review.value_told):
            continue
        writer = SheetWriter(book.create_sheet(title))
        for table in fill(review, writer):
            shown.append((title, table))
        writer.finish(one_page=fill is _summary)
    writer = SheetWriter(book.create_sheet(_("What the figures mean")))
    _meanings(review, writer, shown)
    writer.finish()
    return book


def _moment(created: str) -> datetime:
    """The plan's time without a zone, as the file format wants it."""
    try:
        return datetime.fromisoformat(created).replace(tzinfo=None)
    except ValueError:
        return datetime(2000, 1, 1)


def _without(table: Table, leave_out: frozenset[str]) -> Table:
    return replace(table, columns=tuple(c for c in table.columns if c.key not in leave_out))


def _picked(table: Table, rows: list[int]) -> Table:
    """The same table with these rows only."""
    columns = tuple(replace(c, values=tuple(c.values[row] for row in rows)) for c in table.columns)
    return replace(table, columns=columns)


def _picture(sheet: Worksheet, png: bytes, anchor: str, width: int) -> None:
    image = Image(io.BytesIO(png))
    image.width, image.height = width, round(image.height * width / image.width)
    sheet.add_image(image, anchor)


def _summary(review: _Review, out: SheetWriter) -> list[Table]:
    loaded, plan = review.loaded, review.plan
    category = loaded.catalogue.category or _("the category")
    out.title(_("Range review of {category}: {plan}").format(category=category, plan=plan.name))
    out.sentences([_made_words(review)], faint=True)
    out.row += 1
    out.sentences(words.headline(loaded, review.tally, plan, review.with_costs), strong=True)
    out.heading(_("The plan against today"))
    table = tally_table(loaded, review.tally)
    keys = table.column("key").values
    rows = [k for k, key in enumerate(keys) if key != "margin" or review.margin_told]
    table = _without(_picked(table, rows), frozenset({"key"}))
    table = replace(table, notes=table.notes if review.with_costs else table.notes[:1])
    place = out.table(table)
    for row in range(place.first, place.last + 1):
        # Counts among figures of money.
        if keys[rows[row - place.first]] in ("items", "changes"):
            for key in ("today", "plan", "change"):
                out.sheet.cell(row, place.columns[key]).number_format = "#,##0"
    out.heading(_("Actions per cluster"))
    counts = _counts_table(review)
    out.table(counts)
    out.heading(_("The search"))
    out.sentences(words.solver_words(loaded, review.tally, plan, review.with_costs))
    out.heading(_("Limits that were set"))
    out.sentences([" ".join(words.limits_words(plan.limits, review.with_costs))])
    if plan.notes:
        out.heading(_("Notes"))
        out.sentences([plan.notes])
    out.heading(_("Cautions"))
    out.sentences(cautions())
    out.row += 1
    _picture(out.sheet, _summary_picture(review), f"A{out.row}", 680)
    out.widen(1, 30.0)
    for position in range(2, 10):
        out.widen(position, 14.0)
    return [table, counts]


def _made_words(review: _Review) -> str:
    loaded, plan = review.loaded, review.plan
    return _(
        "Made {created}. History: {weeks} weeks from {first}, {stores} stores, {items} items; offered: "
        "{offers}."
    ).format(
        created=_moment(plan.created).strftime("%Y-%m-%d %H:%M"),
        weeks=len(loaded.panel.weeks),
        first=loaded.panel.weeks[0].isoformat() if loaded.panel.weeks else "-",
        stores=len(loaded.catalogue.stores),
        items=sum(not item.is_offer for item in loaded.catalogue.items),
        offers=sum(item.is_offer for item in loaded.catalogue.items),
    )


def _summary_picture(review: _Review) -> bytes:
    if len(review.plan.rungs) > 1 and review.value_told:
        table = ladder_table(review.loaded, review.plan.rungs)
        unit = _("{goal} a week").format(goal=words.goal_words(review.plan.limits.goal))
        return png_of(ladder_figure(table, unit))
    return png_of(receivers_figure(review.receivers))


def _counts_table(review: _Review) -> Table:
    found = words.action_counts(review.loaded, review.plan)
    columns: list[Column] = [text("cluster", _("Cluster"), [name for name, _counts in found])]
    for action in ACTIONS[:-1]:
        columns.append(count(action, action_word(action), [counts[action] for _name, counts in found]))
    return Table("actions", _("Actions per cluster"), tuple(columns))


def _items(review: _Review, out: SheetWriter) -> list[Table]:
    out.title(_("Item list: what to do in every cluster"))
    table = item_list_table(review.loaded, review.tally.effects, review.plan.states, review.plan.reasons)
    if not review.margin_told:
        table = _without(table, _COSTLY)
    out.sentences([_("Actions stand first and are bold. Sums follow the filter.")], columns=12, faint=True)
    sums = out.row
    out.sentences([_("Sum of the rows shown")], columns=3)
    keep = action_word("keep")
    place = out.table(table, mark=[action != keep for action in table.column("action").values])
    for key in ("units_today", "units", "units_change", "sales", "margin"):
        if key in place.columns and table.n_rows:
            letter = place.letter(key)
            cell = out.sheet.cell(sums, place.columns[key])
            cell.value = f"=SUBTOTAL(109,{letter}{place.first}:{letter}{place.last})"
            cell.number_format = out.sheet.cell(place.first, place.columns[key]).number_format
            cell.font = font(bold=True)
    out.filter_and_freeze(place, left=4)
    clusters = table.column("cluster").values
    ends = [place.first + k for k in range(len(clusters) - 1) if clusters[k] != clusters[k + 1]]
    out.break_pages(ends)
    out.narrow(place.columns["description"], 42.0)
    out.narrow(place.columns["reason"], 30.0)
    return [table]


def _where(review: _Review, out: SheetWriter) -> list[Table]:
    out.title(_("Where sales go: all changes of the plan together"))
    kinds = {
        "changed": _("changed"),
        "item": _("item"),
        "own label": _("sum: own label"),
        "brand": _("sum: brand"),
        "supplier": _("sum: supplier"),
        "leaves": _("leaves"),
    }
    table = review.receivers
    kind = table.column("kind")
    named = replace(kind, values=tuple(kinds[str(value)] for value in kind.values))
    table = replace(table, columns=(named, *table.columns[1:]))
    place = out.table(table, mark=[value in ("changed", "leaves") for value in kind.values])
    out.filter_and_freeze(place, left=3)
    out.narrow(place.columns["description"], 42.0)
    rows = largest_rows(review.receivers, ("changed", "item", "leaves"), _CHART_ROWS)
    if rows:
        _chart(review, out, rows)
    return [table]


def _chart(review: _Review, out: SheetWriter, rows: list[int]) -> None:
    """The block of the largest changes and the chart of it, below the table."""
    source = review.receivers
    change, low, high = (
        np.array([float(str(source.column(key).values[row])) for row in rows])
        for key in ("change", "low", "high")
    )
    unit, decimals = source.column("change").unit, source.column("change").decimals
    block = Table(
        "largest",
        "",
        (
            text("kind", _("Largest changes"), [source.column("description").values[row] for row in rows]),
            number("gain", _("Gain"), np.where(change >= 0.0, change, np.nan), decimals, unit),
            number("loss", _("Loss"), np.where(change < 0.0, change, np.nan), decimals, unit),
            number("below", _("Down to the lower end"), np.maximum(change - low, 0.0), decimals),
            number("above", _("Up to the upper end"), np.maximum(high - change, 0.0), decimals),
        ),
    )
    # The chart is not cut by a page's end.
    out.break_pages([out.row])
    out.heading(_("The largest changes as a chart"))
    top = out.row
    # A row is about 0.53 cm high.
    out.row += 2 + round(chart_height(len(rows)) / 0.53)
    # Under the receivers' names, so that the first column stays narrow.
    left = 3
    place = out.table(block, left=left)
    chart = receivers_chart(out.sheet, left, place.header, place.first, place.last)
    out.sheet.add_chart(chart, f"A{top}")


def _bench(review: _Review, out: SheetWriter) -> list[Table]:
    out.title(_("Single delistings: what each item's delisting alone would do"))
    plan = review.plan
    table = bench_table(review.loaded, review.fitted, review.delistings, plan.states, plan.limits.locks)
    left_out = frozenset({"in_plan", "changed", "lock", "offer"})
    table = _without(table, left_out if review.margin_told else left_out | _COSTLY)
    place = out.table(table)
    out.filter_and_freeze(place, left=3)
    out.narrow(place.columns["description"], 39.0)
    return [table]


def _ladder(review: _Review, out: SheetWriter) -> list[Table]:
    out.title(_("Ladder: the best plan found for so many changes"))
    goal = words.goal_words(review.plan.limits.goal)
    out.sentences([_("Goal: {goal} a week, estimated.").format(goal=goal)], faint=True)
    table = ladder_table(review.loaded, review.plan.rungs)
    place = out.table(table)
    out.filter_and_freeze(place, left=1)
    return [table]


def _limits(review: _Review, out: SheetWriter) -> list[Table]:
    out.title(_("Limits and what the plan uses of them"))
    table = limits_table(review.loaded, review.plan.limits, review.plan.states)
    keys = table.column("key").values
    rows = [k for k, key in enumerate(keys) if review.with_costs or key not in _COSTLY_LIMITS]
    table = _without(_picked(table, rows), frozenset({"key"}))
    place = out.table(table)
    out.filter_and_freeze(place, left=1)
    return [table]


def _sales(review: _Review, out: SheetWriter) -> list[Table]:
    report = review.loaded.report
    out.title(_("Sales data: what was read and what was done with it"))
    reconciliation = reconciliation_table(report)
    out.table(reconciliation)
    out.heading(_("Checks of the rows"))
    checks = checks_table(report, examples=1)
    codes = checks.column("code").values
    rows = [k for k, code in enumerate(codes) if review.with_costs or code not in _COSTLY_CHECKS]
    checks = _without(_picked(checks, rows), frozenset({"code"}))
    out.table(checks)
    out.heading(_("Columns"))
    matches = matches_table(report)
    out.table(matches)
    out.heading(_("What was assumed"))
    out.sentences(notes(review.loaded, review.fitted), columns=7)
    out.widen(1, 44.0)
    return [reconciliation, checks, matches]


def _meanings(review: _Review, out: SheetWriter, shown: list[tuple[str, Table]]) -> None:
    out.title(_("What the figures mean"))
    out.heading(_("The model, and what it does not cover"))
    out.sentences(model_words(review.fitted.model, review.fitted.with_shoppers), columns=3)
    out.heading(_("What the history says"))
    past = history(review.loaded.panel, review.loaded.catalogue)
    out.sentences(evidence_words(review.loaded, review.fitted, review.delistings, past), columns=3)
    out.heading(_("Cautions"))
    out.sentences(cautions(), columns=3)
    out.heading(_("Columns"))
    rows = [
        (title, column.title, meaning(table.key, column.key))
        for title, table in shown
        for column in table.columns
    ]
    out.table(
        Table(
            "meanings",
            "",
            (
                text("sheet", _("Sheet"), [row[0] for row in rows]),
                text("column", _("Column"), [row[1] for row in rows]),
                text("meaning", _("Meaning"), [row[2] for row in rows]),
            ),
        )
    )
    out.widen(1, 20.0)
    out.widen(2, 34.0)
    out.widen(3, 90.0)
