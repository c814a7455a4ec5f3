"""Contrast of marks and texts, and the count of references to None."""

from __future__ import annotations

import sys

import numpy as np
import pytest
from PySide6.QtGui import QColor, QImage, QPainter, QPalette, QPen

from planner.gui.theme.colours import OKABE_ITO, contrast, heat_colours, luminance, marks_of, readable
from planner.gui.theme.icons import icon
from planner.gui.theme.palettes import light_palette

pytestmark = pytest.mark.window


def test_contrast_of_black_on_white_is_21() -> None:
    assert contrast(QColor("black"), QColor("white")) == pytest.approx(21.0)
    # Measured elsewhere for the palette's colours on white, to one decimal.
    for name, ratio in (("blue", 5.2), ("vermillion", 3.9), ("green", 3.4), ("purple", 3.1)):
        assert contrast(QColor(OKABE_ITO[name]), QColor("white")) == pytest.approx(ratio, abs=0.35)


def test_marks_are_readable_on_their_palette(palette: QPalette) -> None:
    marks = marks_of(palette)
    for name in ("gain", "loss", "leaves", "own", "plain", "value", "bound"):
        assert contrast(getattr(marks, name), marks.background) >= 3.0, name
    for name in ("text", "faint"):
        assert contrast(getattr(marks, name), marks.background) >= 4.5, name
        assert contrast(getattr(marks, name), marks.band) >= 4.5, name
    assert contrast(marks.selected_text, marks.selected) >= 4.5


def test_a_selection_too_near_to_its_text_moves_away() -> None:
    palette = light_palette()
    palette.setColor(QPalette.ColorRole.Highlight, QColor("#308cc6"))
    marks = marks_of(palette)
    assert contrast(QColor("#308cc6"), QColor("white")) < 4.5 <= contrast(marks.selected_text, marks.selected)


def test_texts_of_the_palettes_are_readable(palette: QPalette) -> None:
    role = QPalette.ColorRole
    pairs = (
        (role.WindowText, role.Window),
        (role.Text, role.Base),
        (role.ButtonText, role.Button),
        (role.ToolTipText, role.ToolTipBase),
        (role.PlaceholderText, role.Base),
        (role.HighlightedText, role.Highlight),
        (role.Link, role.Base),
    )
    for text, background in pairs:
        assert contrast(palette.color(text), palette.color(background)) >= 4.5, (text, background)


def test_readable_moves_only_as_far_as_needed() -> None:
    white, black = QColor("white"), QColor("black")
    yellow = QColor("#F0E442")
    moved = readable(yellow, white, black, 3.0)
    assert 3.0 <= contrast(moved, white) < 3.6
    blue = QColor(OKABE_ITO["blue"])
    assert readable(blue, white, black, 3.0) == blue


def test_heat_colours_rise_in_luminance() -> None:
    colours = [QColor.fromRgba(int(c)) for c in heat_colours()]
    light = np.array([luminance(c) for c in colours])
    assert len(colours) == 256
    assert (np.diff(light) > -1e-3).all()


def test_icons_follow_the_palette(palette: QPalette) -> None:
    image = icon("save", palette).pixmap(32, 32).toImage()
    seen = {
        image.pixelColor(x, y).name()
        for x in range(image.width())
        for y in range(image.height())
        if image.pixelColor(x, y).alpha() == 255
    }
    assert palette.color(QPalette.ColorRole.ButtonText).name() in seen


def test_painting_keeps_the_references_to_none() -> None:
    """One release of the Qt binding lost one per call and ended the interpreter after minutes."""
    image = QImage(50, 50, QImage.Format.Format_ARGB32)
    painter = QPainter(image)
    pen = QPen(QColor("black"))
    before = sys.getrefcount(None)
    for _round in range(300):
        painter.setPen(pen)
        painter.drawLine(0, 0, 40, 40)
    after = sys.getrefcount(None)
    painter.end()
    assert abs(after - before) < 50
