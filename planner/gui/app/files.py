"""Opening, saving and exporting, with the questions they need."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtWidgets import QCheckBox, QFileDialog, QInputDialog, QLineEdit, QMessageBox, QWidget

from planner.base.paths import demo_folder
from planner.base.text import _
from planner.gui.app.remembered import Remembered
from planner.gui.bridge.review_bridge import ReviewBridge
from planner.plan.plans import NamedPlan

SUFFIX = ".rangewright"


class FileCommands:
    """The File menu.  ``window`` is the parent of every dialog."""

    def __init__(self, window: QWidget, bridge: ReviewBridge, remembered: Remembered) -> None:
        self._window = window
        self._bridge = bridge
        self._remembered = remembered

    # -- opening ---------------------------------------------------------------------------

    def new(self) -> None:
        """Start over."""
        if self.may_leave():
            self._bridge.do(self._bridge.review.new)

    def open_plan(self) -> None:
        """Choose a plan file."""
        path, _filter = QFileDialog.getOpenFileName(
            self._window,
            _("Open a plan"),
            self._remembered.folder(),
            _("Plans (*{suffix})").format(suffix=SUFFIX) + ";;" + _("All files (*)"),
        )
        if path:
            self.open_path(Path(path))

    def open_folder(self) -> None:
        """Choose a folder with the tables."""
        path = QFileDialog.getExistingDirectory(
            self._window, _("Open the folder that holds the tables"), self._remembered.folder()
        )
        if path:
            self.open_path(Path(path))

    def open_demo(self) -> None:
        """Load the demo catalogue."""
        if self.may_leave():
            self._bridge.load_folder(demo_folder(), _("Opening the demo"))

    def open_path(self, path: Path) -> None:
        """A plan file or a folder of tables."""
        if not self.may_leave():
            return
        self._remembered.set_folder(path if path.is_dir() else path.parent)
        if path.is_dir():
            opened = self._bridge.load_folder(path, _("Opening {name}").format(name=path.name))
        else:
            opened = self._bridge.open(path)
        if opened:
            self._remembered.add_recent(path)

    def open_dropped(self, paths: list[Path]) -> None:
        """Files or a folder dropped on the window."""
        if len(paths) == 1 and (paths[0].is_dir() or paths[0].suffix == SUFFIX):
            self.open_path(paths[0])
        elif paths and self.may_leave():
            self._bridge.files_dropped.emit(paths)

    # -- saving ----------------------------------------------------------------------------

    def save(self) -> bool:
        """Save where the plan is, or ask where."""
        if self._bridge.review.path is None:
            return self.save_as()
        return self._bridge.save(None)

    def save_as(self) -> bool:
        """Ask where and save."""
        loaded = self._bridge.review.loaded
        name = file_name(loaded.catalogue.category if loaded is not None else "") + SUFFIX
        path = self._ask_path(_("Save the plan"), name, _("Plans (*{suffix})").format(suffix=SUFFIX))
        if path is None or not self._bridge.save(path):
            return False
        self._remembered.add_recent(path)
        return True

    def may_leave(self) -> bool:
        """Ask about unsaved changes; False: stay."""
        review = self._bridge.review
        if not review.dirty or review.loaded is None:
            return True
        box = QMessageBox(self._window)
        box.setIcon(QMessageBox.Icon.Question)
        box.setWindowTitle(_("Rangewright"))
        box.setText(_("The plan has changes that are not saved."))
        box.setInformativeText(_("Save them, or leave without?"))
        buttons = QMessageBox.StandardButton
        box.setStandardButtons(buttons.Save | buttons.Discard | buttons.Cancel)
        box.setDefaultButton(buttons.Save)
        answer = box.exec()
        if answer == buttons.Save:
            return self.save()
        return answer == buttons.Discard

    def keep(self) -> None:
        """Keep the present plan under a name."""
        count = len(self._bridge.review.plans) + 1
        name, accepted = QInputDialog.getText(
            self._window,
            _("Keep the plan"),
            _("Name of the plan"),
            QLineEdit.EchoMode.Normal,
            _("Plan {number}").format(number=count),
        )
        if accepted and name.strip():
            self._bridge.keep(name.strip())

    # -- exporting -------------------------------------------------------------------------

    def export(self, kind: str, plan: NamedPlan) -> None:
        """Ask where and write the "workbook" or the "stores list" of a plan."""
        loaded = self._bridge.review.loaded
        name = f"{loaded.catalogue.category if loaded else ''} {plan.name}".strip()
        if kind == "workbook":
            asked = (_("Export the workbook"), name, ".xlsx", _("Workbooks (*.xlsx)"), True)
        else:
            stores = _("{plan} stores").format(plan=name)
            asked = (_("Export the stores list"), stores, ".csv", _("Lists (*.csv)"), False)
        self._export(kind, plan, *asked)

    def _export(
        self, kind: str, plan: NamedPlan, title: str, name: str, suffix: str, files: str, costs: bool
    ) -> None:
        dialog = QFileDialog(self._window, title, self._remembered.folder(), files)
        dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
        # Only the program's own dialog can hold the question about costs.
        dialog.setOption(QFileDialog.Option.DontUseNativeDialog)
        dialog.setDefaultSuffix(suffix[1:])
        dialog.selectFile(file_name(name) + suffix)
        box = QCheckBox(_("With c&osts and margins"))
        box.setAccessibleName(_("With costs and margins"))
        box.setChecked(costs)
        layout = dialog.layout()
        if layout is not None:
            layout.addWidget(box)
        if dialog.exec() and dialog.selectedFiles():
            path = Path(dialog.selectedFiles()[0])
            self._remembered.set_folder(path.parent)
            self._bridge.export(kind, path, box.isChecked(), plan)

    def _ask_path(self, title: str, name: str, kind: str) -> Path | None:
        start = str(Path(self._remembered.folder()) / name)
        path, _filter = QFileDialog.getSaveFileName(self._window, title, start, kind)
        if not path:
            return None
        chosen = Path(path)
        if not chosen.suffix:
            chosen = chosen.with_suffix(SUFFIX)
        self._remembered.set_folder(chosen.parent)
        return chosen


def file_name(words: str) -> str:
    """A file name made of words: letters, digits, spaces and a few marks."""
    kept = "".join(letter if letter.isalnum() or letter in " -_" else " " for letter in words)
    return " ".join(kept.split()) or _("plan")
