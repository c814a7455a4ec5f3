"""Sales: which files, what was read from them, and what was done to the rows."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QGridLayout,
    QHBoxLayout,
    QLabel,
    QLineEdit,
    QPushButton,
    QScrollArea,
    QSpinBox,
    QTabWidget,
    QVBoxLayout,
    QWidget,
)

from planner.base.errors import RangewrightError
from planner.base.paths import demo_folder
from planner.base.text import _
from planner.gui.bridge.review_bridge import ReviewBridge
from planner.gui.models.column_matches import read_matches, write_matches
from planner.gui.models.coverage import coverage
from planner.gui.models.table_model import Look, TableModel
from planner.gui.pages.page import Page
from planner.gui.theme import numbers
from planner.gui.widgets.file_rows import FileRow, FileRows
from planner.gui.widgets.heat_map import HeatMap
from planner.gui.widgets.table_view import TableView
from planner.gui.widgets.words import Words, heading


def file_rows() -> tuple[FileRow, ...]:
    """The tables that may be loaded, needed ones first."""
    return (
        FileRow("sales", _("&Sales"), _("needed: store, week or date, item, units, and revenue or price")),
        FileRow("items", _("&Items"), _("needed: item, segment; useful: brand, supplier, cost, space, VAT")),
        FileRow("stores", _("S&tores"), _("store, cluster, space for the category")),
        FileRow("shoppers", _("Sho&ppers"), _("store, week, shoppers who could have bought")),
        FileRow("costs", _("&Costs"), _("item, unit cost, from week")),
        FileRow("ranges", _("Ran&ges"), _("store, item, first and last week")),
        FileRow("offers", _("&Offers"), _("new items with price and cost")),
        FileRow("successors", _("S&uccessors"), _("old item, new item")),
    )


class SalesPage(Page):
    """Files, reconciliation, matches, checks, events, coverage."""

    watched = frozenset({"data"})

    def __init__(self, bridge: ReviewBridge) -> None:
        super().__init__(bridge, "", "")
        column = self.content_column()
        self._head = heading(_("Open the sales of one category"))
        self._summary = QLabel()
        self._summary.setAccessibleName(_("What is loaded"))
        self._summary.setWordWrap(True)
        self._tabs = QTabWidget()
        self._tabs.setAccessibleName(_("Parts of the Sales page"))
        self._tabs.setDocumentMode(True)
        column.addWidget(self._head)
        column.addWidget(self._summary)
        column.addWidget(self._tabs, 1)
        self._tabs.addTab(self._files_tab(), _("Files"))
        self._models: dict[str, TableModel] = {}
        self._notes: dict[str, Words] = {}
        self._table_tabs: list[QWidget] = []
        for key, title, looks in (
            ("reconciliation", _("Reconciliation"), {}),
            ("checks", _("Checks"), {}),
            ("matches", _("Column matches"), {"their_name": Look(editable=True)}),
            ("events", _("Listing events"), {"money": Look(bar=True)}),
        ):
            self._table_tabs.append(self._table_tab(key, title, looks))
        self._coverage = HeatMap(_("Share of stores that list each item, week by week"))
        scroll = QScrollArea()
        scroll.setAccessibleName(_("Coverage"))
        scroll.setFrameShape(QScrollArea.Shape.NoFrame)
        scroll.setWidgetResizable(True)
        scroll.setWidget(self._coverage)
        self._table_tabs.append(scroll)
        self._tabs.addTab(scroll, _("Coverage"))
        self._models["matches"].typed.connect(self._match_typed)
        bridge.job_changed.connect(self._enable)
        bridge.files_dropped.connect(self.take_files)
        self._enable()

    # -- building --------------------------------------------------------------------------

    def _files_tab(self) -> QWidget:
        tab = QWidget()
        row = QHBoxLayout(tab)
        inner = QWidget()
        # Longer lines than this are hard to read, and paths seldom need more.
        inner.setMaximumWidth(980)
        row.setContentsMargins(4, 10, 4, 4)
        row.addWidget(inner, 1)
        row.addStretch(0)
        column = QVBoxLayout(inner)
        column.setContentsMargins(0, 0, 0, 0)
        words = QLabel(
            _(
                "Open a folder that holds sales, items and whatever else there is, or choose the files one "
                "by one: CSV, TSV, XLSX or Parquet, with any column names. Only sales and items are needed. "
                "Your files are never changed. To try the program, open the demo."
            )
        )
        words.setWordWrap(True)
        column.addWidget(words)
        column.addLayout(self._open_buttons())
        self._files = FileRows(file_rows())
        self._files.changed.connect(self._enable)
        column.addWidget(self._files)
        column.addLayout(self._choices())
        self._load = QPushButton(_("Lo&ad these files"))
        self._load.setAccessibleName(_("Load these files"))
        self._load.clicked.connect(self.load)
        column.addWidget(self._load, 0, Qt.AlignmentFlag.AlignLeft)
        column.addStretch(1)
        return tab

    def _open_buttons(self) -> QHBoxLayout:
        row = QHBoxLayout()
        self._demo = QPushButton(_("Open the &demo"))
        self._demo.setAccessibleName(_("Open the demo"))
        self._demo.clicked.connect(lambda: self.bridge.load_folder(demo_folder(), _("Opening the demo")))
        self._folder = QPushButton(_("Ope&n a folder…"))
        self._folder.setAccessibleName(_("Open a folder of tables"))
        self._folder.clicked.connect(self.bridge.folder_wanted)
        row.addWidget(self._folder)
        row.addWidget(self._demo)
        row.addStretch(1)
        return row

    def _choices(self) -> QGridLayout:
        """Category, segments and the window that today is measured on."""
        self._category = QLineEdit()
        self._category.setPlaceholderText(_("only when the files hold several"))
        self._segment_by = QLineEdit()
        self._segment_by.setPlaceholderText(_("columns of the items file, separated by commas"))
        self._matches = QLineEdit()
        self._matches.setPlaceholderText(_("such as sales.units=qty, items.cost=landed"))
        self._matches.setToolTip(
            _("Only where the program took the wrong column: table.column=name in the file, with commas.")
        )
        self._weeks = QSpinBox()
        self._weeks.setRange(1, 104)
        self._weeks.setValue(13)
        self._weeks.setSuffix(" " + _("weeks"))
        grid = QGridLayout()
        grid.setColumnStretch(1, 1)
        grid.setColumnStretch(3, 1)
        for place, (text, name, widget) in enumerate(
            (
                (_("Categor&y"), _("Category"), self._category),
                (_("Segments &by"), _("Columns that form the segments"), self._segment_by),
                (_("Colu&mn matches"), _("Column matches"), self._matches),
                (_("Today is the &last"), _("Weeks that today is measured on"), self._weeks),
            )
        ):
            widget.setAccessibleName(name)
            label = QLabel(text)
            label.setBuddy(widget)
            grid.addWidget(label, place // 2, 2 * (place % 2))
            grid.addWidget(widget, place // 2, 2 * (place % 2) + 1)
        return grid

    def _table_tab(self, key: str, title: str, looks: dict[str, Look]) -> QWidget:
        tab = QWidget()
        column = QVBoxLayout(tab)
        column.setContentsMargins(0, 6, 0, 0)
        model = TableModel(looks)
        plain = title.replace("&", "")
        column.addWidget(TableView(model, plain), 1)
        note = Words(_("Notes on {table}").format(table=plain), spaced=False)
        column.addWidget(note)
        self._models[key], self._notes[key] = model, note
        self._tabs.addTab(tab, title)
        return tab

    # -- doing -----------------------------------------------------------------------------

    def take_files(self, paths: list[Path]) -> None:
        """Put dropped files into the rows whose names they begin with; load when both needed are there."""
        keys = [row.key for row in file_rows()]
        for path in paths:
            name = path.name.casefold()
            key = next((k for k in keys if name.startswith(k) or name.startswith(k[:-1])), "")
            if not key and self._files.path("sales") is None:
                key = "sales"
            if key:
                self._files.set_path(key, path)
        self._tabs.setCurrentIndex(0)
        if self._files.path("sales") and self._files.path("items"):
            self.load()

    def load(self) -> None:
        """Load the chosen files in the child process."""
        files = {row.key: self._files.path(row.key) for row in file_rows()}
        columns = tuple(part.strip() for part in self._segment_by.text().split(",") if part.strip())
        try:
            matches = read_matches(self._matches.text())
        except RangewrightError as error:
            self.bridge.failed.emit(error)
            return
        self.bridge.load_files(
            files,
            matches=matches,
            category=self._category.text().strip(),
            segment_by=columns,
            baseline_weeks=self._weeks.value(),
        )

    def _match_typed(self, row: str, _key: str, name: str) -> None:
        """Another column of the file was named for one of ours: load again with it."""
        table = self._models["matches"].table()
        mine = (table.column("table").values[int(row)], table.column("column").values[int(row)])
        try:
            rest = [match for match in read_matches(self._matches.text()) if match[:2] != mine]
        except RangewrightError as error:
            self.bridge.failed.emit(error)
            return
        self._matches.setText(write_matches([*rest, (str(mine[0]), str(mine[1]), name)]))
        self.load()

    def _enable(self) -> None:
        idle = self.bridge.idle
        ready = self._files.path("sales") is not None and self._files.path("items") is not None
        self._load.setEnabled(idle and ready)
        self._load.setToolTip("" if ready else _("Choose at least the sales and the items file."))
        self._demo.setEnabled(idle)
        self._folder.setEnabled(idle)

    # -- showing ---------------------------------------------------------------------------

    def ready(self) -> bool:
        return True

    def look(self, kinds: frozenset[str]) -> None:
        loaded = self.bridge.review.loaded
        for tab in self._table_tabs:
            self._tabs.setTabVisible(self._tabs.indexOf(tab), loaded is not None)
        if loaded is None:
            self._head.setText(_("Open the sales of one category"))
            self._summary.setText("")
            self._summary.hide()
            return
        catalogue, panel, request = loaded.catalogue, loaded.panel, loaded.request
        self._head.setText(catalogue.category or _("Sales"))
        offers = sum(item.is_offer for item in catalogue.items)
        self._summary.setText(
            _(
                "{items} items in {segments} segments, {offers} offers, {stores} stores in {clusters} "
                "clusters, {weeks} weeks from {first} to {last}. {rows} of {read} sales rows are used."
            ).format(
                items=len(catalogue.items) - offers,
                segments=len(catalogue.segments),
                offers=offers,
                stores=len(catalogue.stores),
                clusters=len(catalogue.clusters),
                weeks=len(panel.weeks),
                first=numbers.day(panel.weeks[0]),
                last=numbers.day(panel.weeks[-1]),
                rows=numbers.number(loaded.report.rows_used),
                read=numbers.number(loaded.report.rows_read),
            )
        )
        self._summary.show()
        for row in file_rows():
            self._files.set_path(row.key, getattr(request, row.key))
        self._category.setText(request.category)
        self._segment_by.setText(", ".join(request.segment_by))
        self._matches.setText(write_matches(request.matches))
        self._weeks.setValue(request.baseline_weeks)
        for key, model in self._models.items():
            table = self.bridge.review.table(key)
            model.set_table(table)
            self._notes[key].set_sentences(table.notes)
        self._notes["reconciliation"].set_sentences(
            (*self.bridge.review.table("reconciliation").notes, *loaded.report.notes, *loaded.base.notes)
        )
        shown = coverage(catalogue, panel.weeks, panel.week_index, panel.listed)
        self._coverage.set_parts(
            shown.parts,
            shown.rows,
            shown.weeks,
            _("{n} items over {weeks} weeks; bright: listed in all stores, dark: in none.").format(
                n=len(shown.rows), weeks=len(shown.weeks)
            ),
        )
        if self._tabs.currentIndex() == 0:
            self._tabs.setCurrentIndex(1)
