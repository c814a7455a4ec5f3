"""Small windows of the Help menu."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from PySide6.QtCore import Qt
from PySide6.QtGui import QAction, QKeySequence
from PySide6.QtWidgets import (
    QDialog,
    QDialogButtonBox,
    QGridLayout,
    QLabel,
    QScrollArea,
    QVBoxLayout,
    QWidget,
)

from planner import __version__
from planner.base.text import _
from planner.gui.widgets.words import Words


def _dialog(parent: QWidget, title: str, content: QWidget, width: int = 560) -> QDialog:
    """A window that does not block, with Close."""
    dialog = QDialog(parent)
    dialog.setWindowTitle(title)
    dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
    scroll = QScrollArea()
    scroll.setAccessibleName(title)
    scroll.setFrameShape(QScrollArea.Shape.NoFrame)
    scroll.setWidgetResizable(True)
    scroll.setWidget(content)
    buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Close)
    buttons.button(QDialogButtonBox.StandardButton.Close).setAccessibleName(_("Close"))
    buttons.rejected.connect(dialog.reject)
    column = QVBoxLayout(dialog)
    column.addWidget(scroll, 1)
    column.addWidget(buttons)
    dialog.resize(width, 420)
    dialog.open()
    return dialog


def show_words(parent: QWidget, title: str, sentences: Sequence[str]) -> QDialog:
    """Sentences to read and copy."""
    words = Words(title)
    words.set_sentences(tuple(sentences) or (_("Nothing to say here yet."),))
    return _dialog(parent, title, words)


def show_keys(parent: QWidget, actions: Mapping[str, QAction]) -> QDialog:
    """Every key of the window."""
    content = QWidget()
    grid = QGridLayout(content)
    pairs = [
        # Without what undo or take would do just now.
        (action.text().replace("&", "").replace("…", "").split(":")[0], action.shortcut())
        for action in actions.values()
        if not action.shortcut().isEmpty()
    ]
    native = QKeySequence.SequenceFormat.NativeText
    lines = [(text, keys.toString(native)) for text, keys in pairs]
    lines += [
        (_("Tick the item of the current row in or out"), _("Space")),
        (_("Copy rows, a list or the tally"), "Ctrl+C"),
        (_("Find an item on the bench"), "Ctrl+F"),
        (_("Next and previous part of the window"), _("Tab, Shift+Tab")),
    ]
    for row, (text, keys_text) in enumerate(lines):
        grid.addWidget(QLabel(text), row, 0)
        grid.addWidget(QLabel(keys_text), row, 1)
    grid.setRowStretch(len(lines), 1)
    return _dialog(parent, _("Keys"), content)


def show_about(parent: QWidget) -> QDialog:
    """What this program is."""
    words = Words(_("About Rangewright"))
    words.set_sentences(
        (
            _("Rangewright {version}").format(version=__version__),
            _(
                "Which items of a category stay, go and come, what happens to their sales, and the best "
                "assortment with a proven bound."
            ),
            _("Nothing leaves this machine: the program uses no network."),
            _(
                "A plan file holds everything: sales, costs and margins. Lists for stores carry no cost "
                "or margin unless you ask for them."
            ),
            _("Licence: MIT."),
        )
    )
    return _dialog(parent, _("About Rangewright"), words, 460)
