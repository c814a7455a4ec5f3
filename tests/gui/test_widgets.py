"""Painted widgets: they draw in both palettes, say in words what they show, and copy."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from PySide6.QtCore import QMimeData, QPoint, Qt, QUrl
from PySide6.QtGui import QGuiApplication, QPalette
from PySide6.QtWidgets import QWidget
from pytestqt.qtbot import QtBot

from planner.gui.models.table_model import TableModel
from planner.gui.theme.cells import BarRow, TallyColumn
from planner.gui.theme.colours import contrast, marks_of
from planner.gui.widgets.bar_list import BarList
from planner.gui.widgets.file_rows import FileRow, FileRows, dropped_paths
from planner.gui.widgets.gap_picture import GapPicture
from planner.gui.widgets.heat_map import HeatMap
from planner.gui.widgets.progress_strip import ProgressStrip
from planner.gui.widgets.table_view import TableView
from planner.gui.widgets.tally_bar import TallyBar
from tests.gui.test_table_model import LOOKS, small

pytestmark = pytest.mark.window


def colours_of(widget: QWidget) -> set[str]:
    """All colours of the painted widget."""
    image = widget.grab().toImage()
    return {image.pixelColor(x, y).name() for x in range(image.width()) for y in range(0, image.height(), 2)}


def shown(qtbot: QtBot, widget: QWidget, width: int = 480, height: int = 220) -> QWidget:
    qtbot.addWidget(widget)
    widget.resize(width, height)
    widget.show()
    widget.activateWindow()
    with qtbot.waitActive(widget):
        pass
    return widget


ROWS = (
    BarRow("Delisted", kind="heading"),
    BarRow("Oat mild", 12.0, 8.0, 15.0, "+12.0", "+8 to +15", identity="001"),
    BarRow("Own oat", 5.0, 4.0, 6.0, "+5.0", "+4 to +6", kind="own", identity="002", note="own label"),
    BarRow("Barley", -20.0, -22.0, -18.0, "−20.0", "−22 to −18", identity="003"),
    BarRow("Leaves the category", -3.0, text="−3.0", kind="leaves"),
)


def test_bar_list_paints_each_kind_in_its_own_colour(qtbot: QtBot, palette: QPalette) -> None:
    bars = BarList("Where sales go")
    bars.set_rows(ROWS)
    shown(qtbot, bars)
    marks = marks_of(palette)
    seen = colours_of(bars)
    for name in ("background", "gain", "loss", "leaves", "own"):
        assert getattr(marks, name).name() in seen, name


def test_bar_list_speaks_and_copies(qtbot: QtBot) -> None:
    bars = BarList("Where sales go")
    bars.set_rows(ROWS)
    shown(qtbot, bars)
    model = bars.model()
    spoken = [model.index(row, 0).data(Qt.ItemDataRole.AccessibleTextRole) for row in range(5)]
    assert spoken[2] == "Own oat (own label): +5.0, interval +4 to +6"
    chosen: list[str] = []
    bars.chosen.connect(chosen.append)
    bars.setFocus()
    bars.setCurrentIndex(model.index(1, 0))
    qtbot.keyClick(bars, Qt.Key.Key_Down)
    assert chosen == ["001", "002"]
    qtbot.keyClick(bars, Qt.Key.Key_C, Qt.KeyboardModifier.ControlModifier)
    assert QGuiApplication.clipboard().text().splitlines()[3] == "Barley\t\t-20.0\t-22 to -18"


def test_gap_picture_closes_in_and_says_so(qtbot: QtBot, palette: QPalette) -> None:
    picture = GapPicture()
    shown(qtbot, picture)
    assert picture.words() == "No run yet."
    picture.begin()
    assert picture.words() == "Running; no answer yet."
    picture.add(0.1, math.nan, 1500.0)
    picture.add(0.5, 1000.0, 1400.0, today=900.0)
    picture.add(1.5, 1100.0, 1111.0)
    assert picture.words() == "Best found 1,100, bound 1,111, gap 1.00 %."
    assert picture.accessibleDescription() == picture.words()
    marks = marks_of(palette)
    seen = colours_of(picture)
    assert marks.value.name() in seen
    assert marks.background.name() in seen
    assert len(picture.points()) == 3


def test_heat_map_shows_and_tells_each_cell(qtbot: QtBot, palette: QPalette) -> None:
    heat = HeatMap("Coverage")
    shown(qtbot, heat)
    parts = np.array([[0.0, 1.0], [math.nan, 0.5]])
    heat.set_parts(parts, ("Oat", "Barley"), ("week 1", "week 2"), "two items")
    seen = colours_of(heat)
    assert {"#00224e", "#fee838"} <= seen
    assert marks_of(palette).grid.name() in seen
    told = {
        heat.words_at(QPoint(x, y)) for x in range(0, heat.width(), 5) for y in range(0, heat.height(), 3)
    }
    assert told == {
        "", "Oat\nweek 1: 0 %", "Oat\nweek 2: 100 %", "Barley\nweek 1: nothing", "Barley\nweek 2: 50 %",
    }  # fmt: skip


def test_tally_shows_marks_and_words(qtbot: QtBot, palette: QPalette) -> None:
    tally = TallyBar()
    shown(qtbot, tally, 900, 90)
    tally.set_columns((), "Fit the share model first.")
    assert tally.accessibleDescription() == "Fit the share model first."
    tally.set_columns(
        (
            TallyColumn("Margin", "1,000", "1,050", "+50", "+20 to +80", 50.0, 20.0, 80.0),
            TallyColumn("Sales", "9,000", "8,900", "−100", "−150 to +10", -100.0, -150.0, 10.0),
            TallyColumn("Items", "60", "61", "+1"),
        )
    )
    assert tally.accessibleDescription().startswith(
        "Margin: today 1,000, plan 1,050, change +50, 80 % interval +20 to +80; Sales"
    )
    seen = colours_of(tally)
    assert marks_of(palette).gain.name() in seen
    tally.copy()
    assert QGuiApplication.clipboard().text().splitlines()[2] == "Sales\t9,000\t8,900\t-100\t-150 to +10"


def test_table_view_sorts_copies_and_keeps_its_row(qtbot: QtBot, palette: QPalette) -> None:
    model = TableModel(LOOKS, identity="item", group="segment")
    view = TableView(model, "Bench")
    model.set_table(small())
    shown(qtbot, view, 900, 240)
    chosen: list[str] = []
    view.chosen.connect(chosen.append)
    view.choose("003")
    assert chosen == ["003"]
    model.filter("barley")
    assert view.current_identity() == "003"
    model.filter("")
    assert view.current_identity() == "003"
    view.horizontalHeader().setSortIndicator(0, Qt.SortOrder.DescendingOrder)
    assert view.current_identity() == "003"
    assert view.columnSpan(0, 0) == model.columnCount()
    view.copy()
    assert QGuiApplication.clipboard().text().splitlines()[1].startswith("003\tBarley")
    marks = marks_of(palette)
    assert {marks.background.name(), marks.band.name(), marks.gain.name()} <= colours_of(view)
    text = contrast(marks.text, marks.background)
    assert text >= 4.5


def test_columns_grow_with_their_texts(qtbot: QtBot) -> None:
    model = TableModel(LOOKS, identity="item")
    view = TableView(model, "Bench")
    model.set_table(small())
    shown(qtbot, view, 900, 240)
    column = model.column_of("description")
    before = view.columnWidth(column)
    model.set_table(small(name="a description that is a good deal longer"))
    assert view.columnWidth(column) > before
    assert view.columnWidth(column) >= view.fontMetrics().horizontalAdvance(
        "a description that is a good deal longer"
    )


def test_space_and_click_turn_a_box(qtbot: QtBot) -> None:
    model = TableModel(LOOKS, identity="item")
    view = TableView(model, "Bench")
    model.set_table(small())
    shown(qtbot, view, 900, 240)
    ticked: list[str] = []
    model.checked.connect(ticked.append)
    index = model.index(1, model.column_of("plan"))
    view.setCurrentIndex(index)
    view.setFocus()
    qtbot.keyClick(view, Qt.Key.Key_Space)
    box = view.visualRect(index)
    where = QPoint(box.left() + 12, box.center().y())
    qtbot.mouseClick(view.viewport(), Qt.MouseButton.LeftButton, pos=where)
    assert ticked == ["002", "002"]
    off = QPoint(box.right() - 3, box.center().y())
    qtbot.mouseClick(view.viewport(), Qt.MouseButton.LeftButton, pos=off)
    assert ticked == ["002", "002"]


def test_progress_strip_names_step_part_and_time(qtbot: QtBot) -> None:
    strip = ProgressStrip()
    qtbot.addWidget(strip)
    assert strip.isHidden()
    strip.start("Fitting")
    strip.report("segments", 0.25)
    texts = [label.text() for label in strip.findChildren(QWidget) if hasattr(label, "setWordWrap")]
    assert texts == ["Fitting: segments", "25 %, 0 s"]
    with qtbot.waitSignal(strip.cancelled):
        strip.findChildren(QWidget)[-1].click()  # type: ignore[attr-defined]
    strip.stopping()
    strip.finish()
    assert strip.isHidden()


def test_file_rows_hold_paths(qtbot: QtBot, tmp_path: Path) -> None:
    rows = FileRows([FileRow("sales", "&Sales", "needed"), FileRow("items", "&Items", "needed")])
    qtbot.addWidget(rows)
    with qtbot.waitSignal(rows.changed):
        rows.set_path("sales", tmp_path / "sales.csv")
    assert rows.path("sales") == tmp_path / "sales.csv"
    assert rows.path("items") is None
    mime = QMimeData()
    mime.setUrls([QUrl.fromLocalFile(str(tmp_path)), QUrl("https://example.org/x.csv")])
    assert dropped_paths(mime) == [tmp_path]
