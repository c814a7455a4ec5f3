"""Words on a page: headings, paragraphs of plain sentences, and what an empty page says."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from PySide6.QtCore import Qt
from PySide6.QtGui import QFont
from PySide6.QtWidgets import QHBoxLayout, QLabel, QPushButton, QSizePolicy, QVBoxLayout, QWidget


def heading(text: str, size: float = 1.25) -> QLabel:
    """A heading ``size`` times as large as the text."""
    label = QLabel(text)
    font = QFont(label.font())
    font.setPointSizeF(font.pointSizeF() * size)
    font.setWeight(QFont.Weight.DemiBold)
    label.setFont(font)
    return label


class Words(QLabel):
    """Sentences under each other, to be read, selected and copied."""

    def __init__(self, name: str, parent: QWidget | None = None, spaced: bool = True) -> None:
        super().__init__(parent)
        self._between = "\n\n" if spaced else "\n"
        self.setAccessibleName(name)
        self.setWordWrap(True)
        self.setTextFormat(Qt.TextFormat.PlainText)
        self.setAlignment(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignTop)
        self.setTextInteractionFlags(
            Qt.TextInteractionFlag.TextSelectableByMouse | Qt.TextInteractionFlag.TextSelectableByKeyboard
        )
        self.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Minimum)

    def set_sentences(self, sentences: Sequence[str]) -> None:
        """One paragraph per sentence."""
        self.setText(self._between.join(sentences))
        self.setVisible(bool(sentences))


class EmptyState(QWidget):
    """What a page says before there is anything to show: what to do next."""

    def __init__(self, title: str, words: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._title = heading(title, 1.4)
        self._title.setAlignment(Qt.AlignmentFlag.AlignHCenter)
        self._words = QLabel(words)
        self._words.setWordWrap(True)
        self._words.setAlignment(Qt.AlignmentFlag.AlignHCenter)
        self._words.setFixedWidth(520)
        self._buttons = QHBoxLayout()
        self._buttons.addStretch(1)
        self._buttons.addStretch(1)
        column = QVBoxLayout(self)
        column.addStretch(2)
        column.addWidget(self._title)
        column.addSpacing(6)
        column.addWidget(self._words, 0, Qt.AlignmentFlag.AlignHCenter)
        column.addSpacing(14)
        column.addLayout(self._buttons)
        column.addStretch(3)

    def set_words(self, title: str, words: str) -> None:
        """Say something else."""
        self._title.setText(title)
        self._words.setText(words)

    def add_button(self, text: str, name: str, press: Callable[[], object]) -> QPushButton:
        """A button under the words."""
        button = QPushButton(text)
        button.setAccessibleName(name)
        button.clicked.connect(lambda: press())
        self._buttons.insertWidget(self._buttons.count() - 1, button)
        return button
