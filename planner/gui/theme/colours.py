"""Colours of marks, all derived from the palette in use.

Marks use the palette of Okabe & Ito (2008), told apart without colour vision; a colour
whose contrast on the present background is too small is moved towards the text colour
until it reaches 3:1 (WCAG 2.2, success criterion 1.4.11).  Text never takes a palette
colour.  Heat maps use cividis (Nunez, Anderton & Renslow 2018).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from PySide6.QtGui import QColor, QPalette

OKABE_ITO = {
    "blue": "#0072B2",
    "sky": "#56B4E9",
    "vermillion": "#D55E00",
    "orange": "#E69F00",
    "green": "#009E73",
    "purple": "#CC79A7",
}

# Every sixteenth colour of cividis; the others are interpolated.
_CIVIDIS = (
    (0, 34, 78), (0, 46, 106), (26, 56, 111), (50, 67, 109), (67, 78, 108), (83, 90, 109),
    (97, 101, 111), (111, 112, 115), (125, 124, 120), (140, 136, 120), (155, 148, 118),
    (171, 160, 114), (188, 174, 108), (205, 187, 99), (222, 201, 88), (240, 216, 70), (254, 232, 56),
)  # fmt: skip


def _channel(value: float) -> float:
    return value / 12.92 if value <= 0.04045 else ((value + 0.055) / 1.055) ** 2.4


def luminance(colour: QColor) -> float:
    """Relative luminance, 0..1 (WCAG 2.2)."""
    red, green, blue = (_channel(v) for v in (colour.redF(), colour.greenF(), colour.blueF()))
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def contrast(one: QColor, other: QColor) -> float:
    """Contrast ratio, 1..21 (WCAG 2.2)."""
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def mixed(one: QColor, other: QColor, part: float) -> QColor:
    """``part`` (0..1) of ``one``, the rest of ``other``."""
    rest = 1.0 - part
    return QColor.fromRgbF(
        one.redF() * part + other.redF() * rest,
        one.greenF() * part + other.greenF() * rest,
        one.blueF() * part + other.blueF() * rest,
    )


def readable(colour: QColor, background: QColor, text: QColor, ratio: float) -> QColor:
    """The colour nearest to ``colour`` on the way to ``text`` that has ``ratio`` on ``background``."""
    for step in range(20):
        candidate = mixed(text, colour, step / 20.0)
        if contrast(candidate, background) >= ratio:
            return candidate
    return QColor(text)


@dataclass(frozen=True)
class Marks:
    """Colours of one palette.  Marks have 3:1 on ``background``, texts 4.5:1.

    gain, loss: bars to the right and left of zero; leaves: what leaves the category;
    own: own label; value, bound: of the optimiser; plain: bars without direction.
    line: axis, whiskers and outlines; grid: faint lines; band: striped or grouped rows.
    """

    background: QColor
    text: QColor
    faint: QColor
    line: QColor
    grid: QColor
    band: QColor
    gain: QColor
    loss: QColor
    leaves: QColor
    own: QColor
    plain: QColor
    value: QColor
    bound: QColor
    selected: QColor
    selected_text: QColor


def marks_of(palette: QPalette, group: QPalette.ColorGroup = QPalette.ColorGroup.Active) -> Marks:
    """The marks' colours on ``palette``."""
    role = QPalette.ColorRole
    named = (role.Base, role.Text, role.Highlight, role.HighlightedText)
    return _marks(*(palette.color(group, r).rgba() for r in named))


# Painters ask for every row; working out the colours would take longer than painting it.
@lru_cache(maxsize=16)
def _marks(base: int, written: int, highlight: int, highlighted: int) -> Marks:
    background, text = QColor.fromRgba(base), QColor.fromRgba(written)
    dark = luminance(background) < 0.2
    selected, selected_text = QColor.fromRgba(highlight), QColor.fromRgba(highlighted)
    # Some systems' selection is too near to its text; away from the text it goes.
    away = QColor("black" if luminance(selected_text) > 0.4 else "white")

    def mark(light_name: str, dark_name: str) -> QColor:
        name = dark_name if dark else light_name
        return readable(QColor(OKABE_ITO[name]), background, text, 3.0)

    return Marks(
        background=background,
        text=text,
        faint=readable(mixed(text, background, 0.6), background, text, 5.1),
        line=mixed(text, background, 0.75),
        grid=mixed(text, background, 0.14),
        band=mixed(text, background, 0.055),
        gain=mark("blue", "sky"),
        loss=mark("vermillion", "orange"),
        leaves=mark("purple", "purple"),
        own=mark("green", "green"),
        plain=readable(mixed(text, background, 0.45), background, text, 3.0),
        value=mark("blue", "sky"),
        bound=mark("vermillion", "orange"),
        selected=readable(selected, selected_text, away, 4.5),
        selected_text=selected_text,
    )


def heat_colours() -> NDArray[np.uint32]:
    """The 256 colours of cividis as 0xffRRGGBB."""
    anchors = np.array(_CIVIDIS, dtype=np.float64)
    at = np.linspace(0.0, len(anchors) - 1.0, 256)
    red, green, blue = (
        np.rint(np.interp(at, np.arange(len(anchors)), anchors[:, k])).astype(np.uint32) for k in range(3)
    )
    packed = np.uint32(0xFF000000) | (red << 16) | (green << 8) | blue
    return packed.astype(np.uint32)
