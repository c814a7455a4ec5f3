"""One row per input table: its file, chosen, typed or dropped."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import NamedTuple

from PySide6.QtCore import QMimeData, Signal
from PySide6.QtGui import QDragEnterEvent, QDropEvent
from PySide6.QtWidgets import QFileDialog, QGridLayout, QLabel, QLineEdit, QPushButton, QWidget

from planner.base.text import _

PATTERNS = "*.csv *.tsv *.txt *.csv.gz *.tsv.gz *.xlsx *.parquet"


class FileRow(NamedTuple):
    """A table that may be loaded.  title carries the mnemonic."""

    key: str
    title: str
    hint: str


def dropped_paths(data: QMimeData) -> list[Path]:
    """Local files and folders of a drop."""
    return [Path(url.toLocalFile()) for url in data.urls() if url.isLocalFile()]


class _PathEdit(QLineEdit):
    """Takes one dropped file."""

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        if dropped_paths(event.mimeData()):
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        paths = dropped_paths(event.mimeData())
        if paths:
            self.setText(str(paths[0]))
            event.acceptProposedAction()


class FileRows(QWidget):
    """``changed`` is sent when any path changes."""

    changed = Signal()

    def __init__(self, rows: Sequence[FileRow], parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._edits: dict[str, QLineEdit] = {}
        self._folder = ""
        grid = QGridLayout(self)
        grid.setContentsMargins(0, 0, 0, 0)
        grid.setColumnStretch(1, 1)
        for number, row in enumerate(rows):
            plain = row.title.replace("&", "")
            edit = _PathEdit()
            edit.setAccessibleName(_("File with {table}").format(table=plain))
            edit.setPlaceholderText(row.hint)
            edit.setToolTip(row.hint)
            edit.setClearButtonEnabled(True)
            edit.textChanged.connect(self.changed)
            label = QLabel(row.title)
            label.setBuddy(edit)
            choose = QPushButton(_("Choose…"))
            choose.setAccessibleName(_("Choose the file with {table}").format(table=plain))
            choose.clicked.connect(lambda _checked=False, key=row.key, name=plain: self._choose(key, name))
            grid.addWidget(label, number, 0)
            grid.addWidget(edit, number, 1)
            grid.addWidget(choose, number, 2)
            self._edits[row.key] = edit

    def _choose(self, key: str, name: str) -> None:
        filters = _("Tables ({patterns})").format(patterns=PATTERNS) + ";;" + _("All files (*)")
        title = _("File with {table}").format(table=name)
        path, _filter = QFileDialog.getOpenFileName(self, title, self._folder, filters)
        if path:
            self._folder = str(Path(path).parent)
            self._edits[key].setText(path)

    def path(self, key: str) -> Path | None:
        """The file chosen for a table; None when empty."""
        text = self._edits[key].text().strip()
        return Path(text) if text else None

    def set_path(self, key: str, path: Path | None) -> None:
        """Show a file for a table."""
        self._edits[key].setText("" if path is None else str(path))
        self._edits[key].setCursorPosition(len(self._edits[key].text()))
