"""A small form for one lock: which item, where, what rule, until when and why."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QComboBox,
    QCompleter,
    QDialog,
    QDialogButtonBox,
    QFormLayout,
    QLineEdit,
    QVBoxLayout,
    QWidget,
)

from planner.base.text import _


class LockDialog(QDialog):
    """items: (code, description); clusters: names; kinds: (kind, words)."""

    def __init__(
        self,
        items: Sequence[tuple[str, str]],
        clusters: Sequence[str],
        kinds: Sequence[tuple[str, str]],
        parent: QWidget | None = None,
    ) -> None:
        super().__init__(parent)
        self.setWindowTitle(_("Lock an item"))
        self._item = QComboBox()
        self._item.setAccessibleName(_("Item to lock"))
        self._item.setEditable(True)
        self._item.setInsertPolicy(QComboBox.InsertPolicy.NoInsert)
        self._item.setMinimumContentsLength(32)
        for code, description in items:
            self._item.addItem(f"{code}  {description}", code)
        completer = QCompleter(self._item.model(), self)
        completer.setFilterMode(Qt.MatchFlag.MatchContains)
        completer.setCompletionMode(QCompleter.CompletionMode.PopupCompletion)
        completer.setCaseSensitivity(Qt.CaseSensitivity.CaseInsensitive)
        self._item.setCompleter(completer)
        self._item.setCurrentIndex(-1)
        self._kind = QComboBox()
        self._kind.setAccessibleName(_("Rule"))
        for kind, words in kinds:
            self._kind.addItem(words, kind)
        self._cluster = QComboBox()
        self._cluster.setAccessibleName(_("Cluster of the lock"))
        self._cluster.addItem(_("All clusters"), "")
        for name in clusters:
            self._cluster.addItem(name, name)
        self._until = QLineEdit()
        self._until.setAccessibleName(_("Until when"))
        self._until.setPlaceholderText(_("a date or words; may stay empty"))
        self._reason = QLineEdit()
        self._reason.setAccessibleName(_("Reason of the lock"))
        self._reason.setPlaceholderText(_("shown beside the decision"))
        form = QFormLayout()
        form.addRow(_("&Item"), self._item)
        form.addRow(_("R&ule"), self._kind)
        form.addRow(_("&Cluster"), self._cluster)
        form.addRow(_("Un&til"), self._until)
        form.addRow(_("&Reason"), self._reason)
        buttons = QDialogButtonBox(
            QDialogButtonBox.StandardButton.Ok | QDialogButtonBox.StandardButton.Cancel
        )
        self._ok = buttons.button(QDialogButtonBox.StandardButton.Ok)
        self._ok.setText(_("&Lock"))
        self._ok.setEnabled(False)
        for button in buttons.buttons():
            button.setAccessibleName(button.text().replace("&", ""))
        buttons.accepted.connect(self.accept)
        buttons.rejected.connect(self.reject)
        self._item.currentIndexChanged.connect(lambda _i: self._ok.setEnabled(bool(self.item())))
        self._item.editTextChanged.connect(lambda _t: self._ok.setEnabled(bool(self.item())))
        column = QVBoxLayout(self)
        column.addLayout(form)
        column.addWidget(buttons)

    def item(self) -> str:
        """Code of the item; empty when the text is no item."""
        at = self._item.findText(self._item.currentText(), Qt.MatchFlag.MatchExactly)
        return "" if at < 0 else str(self._item.itemData(at))

    def choose_item(self, code: str) -> None:
        """Preselect an item."""
        self._item.setCurrentIndex(self._item.findData(code))

    def answer(self) -> tuple[str, str, str, str, str]:
        """(item, kind, cluster, until, reason)."""
        return (
            self.item(),
            str(self._kind.currentData()),
            str(self._cluster.currentData()),
            self._until.text().strip(),
            self._reason.text().strip(),
        )
