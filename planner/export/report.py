"""The printed report of a plan: a PDF for a meeting."""

from __future__ import annotations

import io
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from matplotlib.backends.backend_pdf import PdfPages
from matplotlib.figure import Figure
from matplotlib.image import imread

from planner.base.target_file import replacing
from planner.base.text import _
from planner.demand.fitted import FittedModel
from planner.evidence.history import history
from planner.export import words
from planner.export.meanings import model_words
from planner.figures.ladder import ladder_figure
from planner.figures.receivers import receivers_figure
from planner.figures.style import INK, plain, png_of, shortened
from planner.plan.plans import NamedPlan
from planner.sales.report import LoadedData
from planner.tables.format import column_texts, number
from planner.tables.ladder import ladder_table
from planner.tables.names import changed_pairs
from planner.tables.plan import action_word, cluster_of, item_list_table
from planner.tables.receivers import receivers_table
from planner.tables.table import Column, Table
from planner.tables.tally import tally_table
from planner.tables.words import cautions, evidence_words
from planner.transfer.delistings import delistings
from planner.transfer.tally import tally

ENDINGS = (".pdf",)
# A4 upright, inches; the text field in parts of the page.
_WIDTH, _HEIGHT = 8.27, 11.69
_LEFT, _RIGHT, _TOP, _BOTTOM = 0.08, 0.94, 0.95, 0.06
_LINE = 0.0165
_SIGNS = 104
_FAINT = "#5a5d60"
_SIGNED = ("change", "low", "high", "units_change")


@dataclass(frozen=True)
class _Row:
    """One printed line: its cells as (place from the left 0..1, side, text), and how it looks."""

    cells: tuple[tuple[float, str, str], ...]
    bold: bool = False
    size: float = 9.0
    faint: bool = False
    space: float = 1.0


def _line(text: str, **look: object) -> _Row:
    return _Row(((0.0, "left", text),), **look)  # type: ignore[arg-type]


def _heading(text: str) -> list[_Row]:
    return [_line("", space=0.6), _line(text, bold=True, size=10.5, space=1.25)]


def _wrapped(texts: Sequence[str], bold: bool = False, faint: bool = False) -> list[_Row]:
    """Sentences over the width of the page."""
    rows = []
    for text in texts:
        lines = textwrap.wrap(text, _SIGNS - 8 * bold) or [""]
        rows += [_line(line, bold=bold, faint=faint) for line in lines]
        rows.append(_line("", space=0.3))
    return rows


def _texts(column: Column) -> list[str]:
    """As everywhere, but changes with their sign."""
    if column.key not in _SIGNED:
        return column_texts(column)
    return [
        "" if value is None else number(float(str(value)), column.decimals, signed=True)
        for value in column.values
    ]


def _table_rows(table: Table, widths: Sequence[float], strong: Sequence[bool] = ()) -> list[_Row]:
    """A table as lines; widths: parts of the page's width, texts are cut to them."""
    edges = [sum(widths[:k]) for k in range(len(widths) + 1)]
    texts = [_texts(column) for column in table.columns]

    def cells(values: Sequence[str], size: float) -> tuple[tuple[float, str, str], ...]:
        found = []
        for k, (column, value) in enumerate(zip(table.columns, values, strict=True)):
            room = int(widths[k] * _SIGNS * 9.0 / size) - 1
            right = column.kind in ("count", "number", "money", "percent")
            place = edges[k + 1] - 0.012 if right else edges[k]
            found.append((place, "right" if right else "left", shortened(value, room)))
        return tuple(found)

    rows = [_Row(cells([column.title for column in table.columns], 8.0), bold=True, size=8.0)]
    for k in range(table.n_rows):
        bold = bool(strong) and strong[k]
        rows.append(_Row(cells([column[k] for column in texts], 8.0), bold=bold, size=8.0, space=0.9))
    return rows


class _Pages:
    """Fills pages from top to bottom."""

    def __init__(self, file: PdfPages, footer: str) -> None:
        self._file, self._footer, self._number = file, footer, 0
        self._page: Figure | None = None
        self._at = _TOP

    def rows(self, rows: Sequence[_Row]) -> None:
        """Print lines, on new pages where needed."""
        for row in rows:
            height = _LINE * row.space
            if self._page is None or self._at - height < _BOTTOM + 0.02:
                self._new_page()
            assert self._page is not None
            self._at -= height
            for place, side, text in row.cells:
                self._page.text(
                    _LEFT + place * (_RIGHT - _LEFT),
                    self._at,
                    plain(text),
                    ha=side,
                    va="bottom",
                    fontsize=row.size,
                    fontweight="bold" if row.bold else "normal",
                    color=_FAINT if row.faint else INK,
                )

    def picture(self, figure: Figure) -> None:
        """Print a figure over the page's width."""
        width, height = figure.get_size_inches()
        part = (_RIGHT - _LEFT) * _WIDTH / width * height / _HEIGHT
        if self._page is None or self._at - part < _BOTTOM + 0.02:
            self._new_page()
        assert self._page is not None
        self._at -= part + 0.01
        axes = self._page.add_axes((_LEFT, self._at, _RIGHT - _LEFT, part))
        axes.axis("off")
        axes.imshow(imread(io.BytesIO(png_of(figure, 150))), aspect="auto", interpolation="none")

    def _new_page(self) -> None:
        self.close()
        self._number += 1
        self._page, self._at = Figure(figsize=(_WIDTH, _HEIGHT)), _TOP
        self._page.text(_LEFT, _BOTTOM - 0.02, plain(self._footer), fontsize=7.5, color=_FAINT)
        self._page.text(_RIGHT, _BOTTOM - 0.02, str(self._number), fontsize=7.5, ha="right", color=_FAINT)

    def close(self) -> None:
        """Put the page that is being filled into the file."""
        if self._page is not None:
            self._file.savefig(self._page)  # type: ignore[no-untyped-call]
            self._page = None


def write_report(
    path: Path, loaded: LoadedData, fitted: FittedModel, plan: NamedPlan, with_costs: bool = True
) -> None:
    """Write the report of one plan as PDF, in place of an earlier file in one step.

    with_costs: False leaves out every cost and margin figure.  Raises CallError when the target
    cannot be written.
    """
    category = loaded.catalogue.category or _("the category")
    title = _("Range review of {category}: {plan}").format(category=category, plan=plan.name)
    about = {"Title": title, "Creator": "Rangewright", "Producer": None, "CreationDate": None}
    with replacing(path, ENDINGS) as part, PdfPages(part, metadata=about) as file:
        pages = _Pages(file, title)
        pages.rows([_line(shortened(title, 60), bold=True, size=15.0, space=2.0)])
        _first_page(pages, loaded, fitted, plan, with_costs)
        pages.close()


def _first_page(
    pages: _Pages, loaded: LoadedData, fitted: FittedModel, plan: NamedPlan, with_costs: bool
) -> None:
    figures = tally(fitted, loaded.base, plan.states)
    told = with_costs and words.has_costs(loaded)
    pages.rows(_wrapped(words.headline(loaded, figures, plan, with_costs), bold=True))
    pages.rows(_heading(_("The plan against today")))
    table = tally_table(loaded, figures)
    keys = table.column("key").values
    rows = [k for k, key in enumerate(keys) if told or key != "margin"]
    columns = tuple(replace(c, values=tuple(c.values[k] for k in rows)) for c in table.columns[1:])
    pages.rows(_table_rows(replace(table, columns=columns), (0.32, 0.1, 0.1, 0.1, 0.13, 0.13, 0.12)))
    pages.rows(_wrapped(table.notes if with_costs else table.notes[:1], faint=True))
    pages.rows(_heading(_("The search")))
    pages.rows(_wrapped(words.solver_words(loaded, figures, plan, with_costs)))
    pages.rows(_heading(_("Limits that were set")))
    pages.rows(_wrapped([" ".join(words.limits_words(plan.limits, with_costs))]))
    if plan.notes:
        pages.rows([*_heading(_("Notes")), *_wrapped([plan.notes])])
    pages.rows([*_heading(_("Cautions")), *_wrapped(cautions())])
    changed = changed_pairs(loaded.base.today, cluster_of(loaded), plan.states)
    receivers = receivers_table(loaded, figures.effects, changed=changed)
    pages.picture(receivers_figure(receivers, most=11))
    if len(plan.rungs) > 1 and (with_costs or plan.limits.goal != "margin"):
        unit = _("{goal} a week").format(goal=words.goal_words(plan.limits.goal))
        pages.picture(ladder_figure(ladder_table(loaded, plan.rungs), unit))
    pages.rows(_heading(_("What changes")))
    items = item_list_table(loaded, figures.effects, plan.states, plan.reasons)
    pages.rows(_changes(items))
    pages.rows(_heading(_("How this is known")))
    past = history(loaded.panel, loaded.catalogue)
    said = evidence_words(loaded, fitted, delistings(fitted, loaded.base), past)
    pages.rows(_wrapped([*model_words(fitted.model, fitted.with_shoppers), *said]))


def _changes(items: Table) -> list[_Row]:
    """The rows of the item list that are actions."""
    keep = action_word("keep")
    rows = [k for k, action in enumerate(items.column("action").values) if action != keep]
    if not rows:
        return _wrapped([_("Nothing changes against today.")])
    widths = {"cluster": 0.1, "action": 0.09, "item": 0.1, "description": 0.3, "segment": 0.15,
              "units_change": 0.08, "reason": 0.18}  # fmt: skip
    columns = []
    for key in widths:
        column = items.column(key)
        title = _("Units") if key == "units_change" else column.title
        columns.append(replace(column, values=tuple(column.values[k] for k in rows), title=title))
    return _table_rows(replace(items, columns=tuple(columns)), tuple(widths.values()))
