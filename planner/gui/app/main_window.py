"""The window: five pages on the left, one in the middle, the tally along the bottom."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import QEvent, QSize, Qt
from PySide6.QtGui import (
    QAction,
    QActionGroup,
    QCloseEvent,
    QDragEnterEvent,
    QDropEvent,
    QKeySequence,
    QPalette,
)
from PySide6.QtWidgets import (
    QApplication,
    QHBoxLayout,
    QListWidget,
    QListWidgetItem,
    QMainWindow,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from planner.base.text import _
from planner.gui.app import dialogs
from planner.gui.app.actions import Actions
from planner.gui.app.files import FileCommands
from planner.gui.app.remembered import Remembered
from planner.gui.app.show_error import show_error
from planner.gui.bridge.review_bridge import ReviewBridge
from planner.gui.models.tally_columns import tally_columns
from planner.gui.pages.bench import BenchPage
from planner.gui.pages.best_plan import BestPlanPage
from planner.gui.pages.evidence import EvidencePage
from planner.gui.pages.page import Page
from planner.gui.pages.sales import SalesPage
from planner.gui.pages.saved_plans import SavedPlansPage
from planner.gui.theme.cells import TallyColumn
from planner.gui.theme.icons import icon, program_icon
from planner.gui.theme.palettes import dark_palette, light_palette
from planner.gui.widgets.file_rows import dropped_paths
from planner.gui.widgets.progress_strip import ProgressStrip
from planner.gui.widgets.tally_bar import TallyBar

_PAGES = ("sales", "evidence", "bench", "best_plan", "saved_plans")


class MainWindow(QMainWindow):
    """One review in one window."""

    def __init__(self, bridge: ReviewBridge, remembered: Remembered) -> None:
        super().__init__()
        self.bridge = bridge
        self.remembered = remembered
        self.files = FileCommands(self, bridge, remembered)
        self.setObjectName("main")
        self.setWindowIcon(program_icon())
        self.setAcceptDrops(True)
        self.evidence, self.best_plan = EvidencePage(bridge), BestPlanPage(bridge)
        self.bench, self.saved_plans = BenchPage(bridge), SavedPlansPage(bridge)
        self.pages: dict[str, Page] = {
            "sales": SalesPage(bridge),
            "evidence": self.evidence,
            "bench": self.bench,
            "best_plan": self.best_plan,
            "saved_plans": self.saved_plans,
        }
        self._build()
        self.actions_ = Actions(self, self._handlers())
        self._view_menu()
        self._connect()
        self._paint_icons()
        room = self.screen().availableGeometry()
        # Room for the frame, which is not known before the window is shown.
        self.resize(min(1366, room.width() - 16), min(820, room.height() - 48))
        self._restore()
        self._refresh(frozenset({"data", "fit", "states", "history", "file"}))
        self._job_changed()
        self.show_page("sales")

    # -- building ------------------------------------------------------------------------------

    def _build(self) -> None:
        self._list = QListWidget()
        self._list.setObjectName("pages")
        self._list.setAccessibleName(_("Pages"))
        self._list.setIconSize(QSize(20, 20))
        self._list.setFrameShape(QListWidget.Shape.NoFrame)
        self._list.setFixedWidth(self.fontMetrics().horizontalAdvance("Saved plans") + 66)
        self._list.setSpacing(2)
        self._stack = QStackedWidget()
        for number, (key, title) in enumerate(_titles().items()):
            entry = QListWidgetItem(title)
            entry.setData(Qt.ItemDataRole.UserRole, key)
            entry.setToolTip(_("{page} (Ctrl+{number})").format(page=title, number=number + 1))
            entry.setSizeHint(QSize(10, 36))
            self._list.addItem(entry)
            self._stack.addWidget(self.pages[key])
        self._list.currentRowChanged.connect(self._stack.setCurrentIndex)
        self.tally = TallyBar()
        self.strip = ProgressStrip()
        upper = QHBoxLayout()
        upper.setContentsMargins(0, 0, 0, 0)
        upper.setSpacing(0)
        upper.addWidget(self._list)
        upper.addWidget(self._stack, 1)
        middle = QWidget()
        column = QVBoxLayout(middle)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addLayout(upper, 1)
        column.addWidget(self.tally)
        self.setCentralWidget(middle)
        self.statusBar().addPermanentWidget(self.strip, 1)
        self.statusBar().setSizeGripEnabled(False)

    def _handlers(self) -> dict[str, Callable[[], object]]:
        review = self.bridge.review
        return {
            "new": self.files.new,
            "open": self.files.open_plan,
            "folder": self.files.open_folder,
            "demo": self.files.open_demo,
            "save": self.files.save,
            "save_as": self.files.save_as,
            "export": lambda: self.export("workbook"),
            "stores_list": lambda: self.export("stores list"),
            "quit": self.close,
            "undo": lambda: self.bridge.do(review.undo),
            "redo": lambda: self.bridge.do(review.redo),
            "take": self.bridge.take,
            "keep": self.files.keep,
            "today": lambda: self.bridge.do(review.back_to_today),
            "fit": self.evidence.fit,
            "recommend": self.best_plan.run,
            "cancel": self.bridge.cancel,
            "cautions": lambda: dialogs.show_words(self, _("Cautions"), review.words("cautions")),
            "notes": lambda: dialogs.show_words(self, _("What the figures rest on"), review.words("notes")),
            "keys": lambda: dialogs.show_keys(self, self.actions_.by_key),
            "about": lambda: dialogs.show_about(self),
        }

    def _view_menu(self) -> None:
        menu = self.actions_.menus["view"]
        for number, (key, title) in enumerate(_titles().items()):
            action = QAction(f"&{number + 1}  {title}", self)
            action.setShortcut(QKeySequence(f"Ctrl+{number + 1}"))
            action.triggered.connect(lambda _checked=False, page=key: self.show_page(page))
            menu.addAction(action)
            self.actions_.by_key[f"page_{key}"] = action
        menu.addSeparator()
        colours = menu.addMenu(_("&Colours"))
        group = QActionGroup(self)
        chosen = self.remembered.word("colours", "system")
        choices = (("system", _("As the &system")), ("light", _("&Light")), ("dark", _("&Dark")))
        for word, title in choices:
            action = QAction(title, self)
            action.setCheckable(True)
            action.setChecked(word == chosen)
            action.triggered.connect(lambda _checked=False, colours=word: self.set_colours(colours))
            group.addAction(action)
            colours.addAction(action)

    def _connect(self) -> None:
        bridge = self.bridge
        bridge.changed.connect(self._refresh)
        bridge.job_changed.connect(self._job_changed)
        bridge.progress.connect(self.strip.report)
        bridge.failed.connect(lambda error: show_error(self, error))
        bridge.finished.connect(self._finished)
        bridge.cancelled.connect(
            lambda key: self.statusBar().showMessage(_("Cancelled. What was there before is kept."), 8000)
        )
        bridge.proposal_changed.connect(self._enable)
        bridge.stopping.connect(self.strip.stopping)
        bridge.folder_wanted.connect(self.files.open_folder)
        bridge.files_dropped.connect(lambda _paths: self.show_page("sales"))
        bridge.saved.connect(self._enable)
        self.saved_plans.keep_wanted.connect(self.files.keep)
        self.saved_plans.export_wanted.connect(self.export)
        self.strip.cancelled.connect(bridge.cancel)
        self.actions_.recent.aboutToShow.connect(self._fill_recent)
        self._fill_recent()

    def export(self, kind: str) -> None:
        """Export the plan chosen on the page of saved plans when it is in front, else the present plan."""
        chosen = self.current_page() == "saved_plans"
        plan = self.saved_plans.chosen() if chosen else self.bridge.present_plan()
        self.files.export(kind, plan)

    # -- showing -------------------------------------------------------------------------------

    def show_page(self, key: str) -> None:
        """Bring a page to the front."""
        self._list.setCurrentRow(_PAGES.index(key))
        self._stack.setCurrentWidget(self.pages[key])

    def current_page(self) -> str:
        """Key of the page in front."""
        return _PAGES[self._list.currentRow()]

    def _refresh(self, kinds: frozenset[str]) -> None:
        if kinds & {"data", "fit", "states"}:
            columns = self._tally_columns()
            self.tally.set_columns(columns, self._tally_hint())
        self._enable()

    def _tally_columns(self) -> tuple[TallyColumn, ...]:
        review = self.bridge.review
        if review.loaded is None or review.fitted is None:
            return ()
        known = any(item.cost is not None for item in review.loaded.catalogue.items)
        return tally_columns(review.tally(), review.loaded.catalogue.clusters, known)

    def _tally_hint(self) -> str:
        if self.bridge.review.loaded is None:
            return _("The tally of the plan against today stands here once sales are loaded.")
        return _("Fit the share model on the Evidence page: then the plan is tallied against today here.")

    def _enable(self) -> None:
        review, by_key = self.bridge.review, self.actions_.by_key
        loaded, fitted, idle = review.loaded is not None, review.fitted is not None, self.bridge.idle
        proposal = self.bridge.proposal
        able = {
            "new": idle,
            "open": idle,
            "folder": idle,
            "demo": idle,
            "save": loaded,
            "save_as": loaded,
            "export": fitted and idle,
            "stores_list": fitted and idle,
            "undo": review.can_undo,
            "redo": review.can_redo,
            "take": proposal is not None,
            "keep": fitted,
            "today": loaded,
            "fit": loaded and idle,
            "recommend": fitted and idle,
            "cancel": not idle,
            "notes": loaded,
        }
        for key, on in able.items():
            by_key[key].setEnabled(on)
        undo, redo = review.undo_label, review.redo_label
        by_key["undo"].setText(_("&Undo: {what}").format(what=undo) if undo else _("&Undo"))
        by_key["redo"].setText(_("&Redo: {what}").format(what=redo) if redo else _("&Redo"))
        for key, short in (("undo", _("Undo")), ("redo", _("Redo"))):
            by_key[key].setIconText(short)
        label = proposal.label if proposal else ""
        by_key["take"].setText(
            _("&Take into the plan: {what}").format(what=label) if label else _("&Take into the plan")
        )
        by_key["take"].setIconText(_("Take into the plan"))
        self._title()

    def _title(self) -> None:
        review = self.bridge.review
        if review.path is not None:
            name = review.path.stem
        elif review.loaded is not None:
            name = review.loaded.catalogue.category or _("unnamed review")
        else:
            name = ""
        self.setWindowTitle(f"{name}[*] — Rangewright" if name else "Rangewright[*]")
        self.setWindowModified(bool(review.dirty and review.loaded is not None))

    def _job_changed(self) -> None:
        running = self.bridge.running
        if running is None:
            self.strip.finish()
        else:
            self.strip.start(running.title)
        self._enable()

    def _finished(self, key: str, result: object) -> None:
        said = {
            # Says what of an earlier plan did not fit the new data.
            "load": _("Done: {what}.").format(what=self.bridge.last_label),
            "fit": _("The share model is fitted."),
            "recommend": _("The best plan is found."),
        }
        self.statusBar().showMessage(said.get(key, _("Done.")), 8000)

    def _fill_recent(self) -> None:
        menu = self.actions_.recent
        menu.clear()
        for path in self.remembered.recent():
            action = menu.addAction(path)
            action.triggered.connect(lambda _checked=False, p=path: self.files.open_path(Path(p)))
        if menu.isEmpty():
            menu.addAction(_("Nothing opened yet")).setEnabled(False)
            return
        menu.addSeparator()
        menu.addAction(_("&Clear the list")).triggered.connect(self.remembered.clear_recent)

    # -- colours -------------------------------------------------------------------------------

    def set_colours(self, word: str) -> None:
        """As the system, light or dark."""
        self.remembered.set_word("colours", word)
        apply_colours(word)

    def _paint_icons(self) -> None:
        self.actions_.paint_icons(self.palette())
        for row, key in enumerate(_PAGES):
            self._list.item(row).setIcon(icon(key, self.palette()))

    def changeEvent(self, event: QEvent) -> None:
        super().changeEvent(event)
        if event.type() == QEvent.Type.PaletteChange and hasattr(self, "actions_"):
            self._paint_icons()

    # -- dropping, closing, remembering ----------------------------------------------------------

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        if self.bridge.idle and dropped_paths(event.mimeData()):
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        event.acceptProposedAction()
        self.files.open_dropped(dropped_paths(event.mimeData()))

    def _restore(self) -> None:
        self.restoreGeometry(self.remembered.bytes_of("window/geometry"))
        self.restoreState(self.remembered.bytes_of("window/state"))
        for name, page in self.pages.items():
            page.restore(self.remembered.bytes_of(f"pages/{name}"))

    def closeEvent(self, event: QCloseEvent) -> None:
        if not self.files.may_leave():
            event.ignore()
            return
        self.remembered.set_bytes("window/geometry", self.saveGeometry())
        self.remembered.set_bytes("window/state", self.saveState())
        for name, page in self.pages.items():
            self.remembered.set_bytes(f"pages/{name}", page.kept_state())
        self.remembered.flush()
        self.bridge.close()
        event.accept()


def _titles() -> dict[str, str]:
    """Titles of the pages, in order."""
    return {
        "sales": _("Sales"),
        "evidence": _("Evidence"),
        "bench": _("Bench"),
        "best_plan": _("Best plan"),
        "saved_plans": _("Saved plans"),
    }


def apply_colours(word: str) -> None:
    """Set the palette of the whole program."""
    app = QApplication.instance()
    assert isinstance(app, QApplication)
    palettes = {"light": light_palette, "dark": dark_palette}
    app.setPalette(palettes[word]() if word in palettes else QPalette())
