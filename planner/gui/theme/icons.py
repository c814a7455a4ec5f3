"""Line icons in the colour of the palette's text, from resources/icons."""

from __future__ import annotations

from PySide6.QtCore import QByteArray, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QIcon, QPainter, QPalette, QPixmap
from PySide6.QtSvg import QSvgRenderer

from planner.base.paths import resources_folder

# Drawn at twice the size shown, so that they stay sharp on screens with small pixels.
_SIZES = (32, 48, 64)


def _drawn(source: bytes, colour: QColor, size: int) -> QPixmap:
    renderer = QSvgRenderer(QByteArray(source.replace(b"currentColor", colour.name().encode())))
    pixmap = QPixmap(QSize(size, size))
    pixmap.fill(Qt.GlobalColor.transparent)
    painter = QPainter(pixmap)
    renderer.render(painter, QRectF(0.0, 0.0, size, size))
    painter.end()
    return pixmap


def icon(name: str, palette: QPalette) -> QIcon:
    """The icon ``name`` for normal, disabled and selected state."""
    source = (resources_folder() / "icons" / f"{name}.svg").read_bytes()
    drawn = QIcon()
    groups = (
        (QIcon.Mode.Normal, QPalette.ColorGroup.Active, QPalette.ColorRole.ButtonText),
        (QIcon.Mode.Disabled, QPalette.ColorGroup.Disabled, QPalette.ColorRole.ButtonText),
        (QIcon.Mode.Selected, QPalette.ColorGroup.Active, QPalette.ColorRole.HighlightedText),
    )
    for mode, group, role in groups:
        for size in _SIZES:
            drawn.addPixmap(_drawn(source, palette.color(group, role), size), mode)
    return drawn


def program_icon() -> QIcon:
    """The program's own icon."""
    return QIcon(str(resources_folder() / "icons" / "rangewright.svg"))
