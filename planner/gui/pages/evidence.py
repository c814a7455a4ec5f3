"""Evidence: fit the share model, read in plain words what it found, figures one click behind."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QComboBox,
    QHBoxLayout,
    QLabel,
    QPushButton,
    QScrollArea,
    QSplitter,
    QToolButton,
    QVBoxLayout,
    QWidget,
)

from planner.base.text import _
from planner.gui.bridge.review_bridge import ReviewBridge
from planner.gui.models.table_model import Look, TableModel
from planner.gui.pages.page import Page
from planner.gui.widgets.table_view import TableView
from planner.gui.widgets.words import Words, heading
from planner.tables.table import Table

MODELS = ("nested", "plain")


class EvidencePage(Page):
    """Which model, how sure."""

    watched = frozenset({"data", "fit"})

    def __init__(self, bridge: ReviewBridge) -> None:
        super().__init__(
            bridge,
            _("No sales loaded yet"),
            _("The evidence comes from the sales history. Open it on the Sales page first."),
        )
        column = self.content_column()
        column.addLayout(self._top())
        self._state = QLabel()
        self._state.setAccessibleName(_("State of the share model"))
        self._state.setWordWrap(True)
        column.addWidget(self._state)
        column.addWidget(self._middle(), 1)
        bridge.job_changed.connect(self._job_changed)
        self._job_changed()

    def _top(self) -> QHBoxLayout:
        row = QHBoxLayout()
        row.addWidget(heading(_("How sales move when items go")))
        row.addStretch(1)
        label = QLabel(_("&Model"))
        self._model = QComboBox()
        self._model.setAccessibleName(_("Share model"))
        self._model.addItem(_("Nested: items of a segment are closer"), "nested")
        self._model.addItem(_("Plain: every item is alike"), "plain")
        label.setBuddy(self._model)
        self._fit = QPushButton(_("F&it the share model"))
        self._fit.setAccessibleName(_("Fit the share model"))
        self._fit.clicked.connect(self.fit)
        row.addWidget(label)
        row.addWidget(self._model)
        row.addWidget(self._fit)
        return row

    def _middle(self) -> QWidget:
        self._words = Words(_("What the history says"))
        self._cautions = Words(_("Cautions"))
        inner = QWidget()
        words = QVBoxLayout(inner)
        words.setContentsMargins(0, 0, 10, 0)
        words.addWidget(self._words)
        words.addSpacing(8)
        words.addWidget(heading(_("Cautions"), 1.0))
        words.addWidget(self._cautions)
        words.addStretch(1)
        scroll = QScrollArea()
        scroll.setAccessibleName(_("What the history says"))
        scroll.setFrameShape(QScrollArea.Shape.NoFrame)
        scroll.setWidgetResizable(True)
        scroll.setWidget(inner)
        self._segments = TableModel({"ratio": Look(bar=True, low="low", high="high")}, identity="segment")
        segments = TableView(self._segments, _("Segments: how closed each one is"))
        self._parameters = TableModel(identity="name")
        self._figures = TableView(self._parameters, _("Parameters with standard errors"))
        self._figures.hide()
        self._more = QToolButton()
        self._more.setText(_("Show the fi&gures behind"))
        self._more.setAccessibleName(_("Show the figures behind the words"))
        self._more.setCheckable(True)
        self._more.setToolButtonStyle(Qt.ToolButtonStyle.ToolButtonTextBesideIcon)
        self._more.setArrowType(Qt.ArrowType.RightArrow)
        self._more.toggled.connect(self._show_figures)
        self._right = right = QWidget()
        tables = QVBoxLayout(right)
        tables.setContentsMargins(0, 0, 0, 0)
        tables.addWidget(heading(_("Segments"), 1.0))
        segments.fit_rows(12)
        tables.addWidget(segments)
        self._note = Words(_("Notes on the segments"), spaced=False)
        tables.addWidget(self._note)
        tables.addWidget(self._more)
        tables.addWidget(self._figures, 1)
        self._figure_notes = Words(_("Notes on the parameters"), spaced=False)
        self._figure_notes.hide()
        tables.addWidget(self._figure_notes)
        self._filler = QWidget()
        tables.addWidget(self._filler, 1)
        split = QSplitter(Qt.Orientation.Horizontal)
        split.addWidget(scroll)
        split.addWidget(right)
        split.setChildrenCollapsible(False)
        split.setSizes([420, 640])
        return split

    # -- doing -----------------------------------------------------------------------------

    def fit(self) -> None:
        """Fit in the child process."""
        self.bridge.fit(str(self._model.currentData()))

    def _show_figures(self, shown: bool) -> None:
        self._figures.setVisible(shown)
        self._figure_notes.setVisible(shown)
        self._filler.setVisible(not shown)
        self._more.setArrowType(Qt.ArrowType.DownArrow if shown else Qt.ArrowType.RightArrow)
        self._more.setText(_("Hide the fi&gures behind") if shown else _("Show the fi&gures behind"))

    def _job_changed(self) -> None:
        self._fit.setEnabled(self.bridge.idle and self.ready())

    # -- showing ---------------------------------------------------------------------------

    def ready(self) -> bool:
        return self.bridge.review.loaded is not None

    def look(self, kinds: frozenset[str]) -> None:
        review = self.bridge.review
        self._job_changed()
        fitted = review.fitted is not None
        for widget in (self._words, self._right):
            widget.setVisible(fitted)
        self._state.setVisible(not fitted)
        self._cautions.set_sentences(review.words("cautions"))
        if not fitted:
            self._state.setText(_("No share model yet. Press “Fit the share model”; it takes some seconds."))
            self._segments.set_table(Table("", "", ()))
            return
        self._words.set_sentences(review.words("evidence"))
        segments = review.table("segments")
        self._segments.set_table(segments)
        self._note.set_sentences(segments.notes)
        parameters = review.table("parameters")
        self._parameters.set_table(parameters)
        self._figure_notes.setText("\n".join(parameters.notes))
