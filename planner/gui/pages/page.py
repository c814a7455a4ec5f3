"""What the five pages share: when they look anew, and an empty page that says what to do."""

from __future__ import annotations

from PySide6.QtCore import QByteArray
from PySide6.QtGui import QShowEvent
from PySide6.QtWidgets import QStackedLayout, QVBoxLayout, QWidget

from planner.gui.bridge.review_bridge import ReviewBridge
from planner.gui.widgets.words import EmptyState


class Page(QWidget):
    """A page looks anew when something it shows has changed, but only while it is seen.

    Subclasses build into ``self.content``, set ``watched`` to the kinds of change they show,
    and write ``ready`` (is there anything to show?) and ``look`` (read it from the review).
    """

    watched: frozenset[str] = frozenset()

    def __init__(self, bridge: ReviewBridge, empty_title: str, empty_words: str) -> None:
        super().__init__()
        self.bridge = bridge
        self.content = QWidget()
        self.empty = EmptyState(empty_title, empty_words)
        self._stack = QStackedLayout(self)
        self._stack.addWidget(self.empty)
        self._stack.addWidget(self.content)
        self._pending: set[str] = set(self.watched)
        bridge.changed.connect(self._changed)

    def content_column(self, margin: int = 14) -> QVBoxLayout:
        """The layout of the content."""
        column = QVBoxLayout(self.content)
        column.setContentsMargins(margin, 10, margin, 8)
        column.setSpacing(8)
        return column

    def ready(self) -> bool:
        """Is there anything to show?"""
        raise NotImplementedError

    def look(self, kinds: frozenset[str]) -> None:
        """Read the review again; ``kinds`` says what has changed."""
        raise NotImplementedError

    def kept_state(self) -> QByteArray:
        """What the page remembers between runs (where its parts are divided)."""
        return QByteArray()

    def restore(self, state: QByteArray) -> None:
        """Take up what was remembered."""

    def _changed(self, kinds: frozenset[str]) -> None:
        self._pending |= kinds & self.watched
        if self.isVisible():
            self._look_now()

    def _look_now(self) -> None:
        if not self._pending:
            return
        kinds, self._pending = frozenset(self._pending), set()
        ready = self.ready()
        self._stack.setCurrentWidget(self.content if ready else self.empty)
        if ready:
            try:
                self.look(kinds)
            except Exception as error:
                # Inside Qt's own call of showEvent an exception would end the program.
                self.bridge.failed.emit(error)

    def showEvent(self, event: QShowEvent) -> None:
        super().showEvent(event)
        self._look_now()
