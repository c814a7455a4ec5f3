"""The two explicit palettes, for users who choose one and for tests of both."""

from __future__ import annotations

from PySide6.QtGui import QColor, QPalette

_LIGHT = {
    "Window": "#f3f3f1",
    "WindowText": "#1b1d1f",
    "Base": "#ffffff",
    "AlternateBase": "#f6f6f4",
    "Text": "#1b1d1f",
    "Button": "#ebebe8",
    "ButtonText": "#1b1d1f",
    "BrightText": "#ffffff",
    "ToolTipBase": "#fffdf2",
    "ToolTipText": "#1b1d1f",
    "Highlight": "#1f5f8b",
    "HighlightedText": "#ffffff",
    "Link": "#0b5c91",
    "LinkVisited": "#6b4a86",
    "PlaceholderText": "#686b6e",
    "Light": "#ffffff",
    "Midlight": "#f0f0ee",
    "Mid": "#c3c3bf",
    "Dark": "#9c9c98",
    "Shadow": "#6f6f6c",
}

_DARK = {
    "Window": "#303337",
    "WindowText": "#e9e9e6",
    "Base": "#1c1e20",
    "AlternateBase": "#222427",
    "Text": "#e9e9e6",
    "Button": "#3f4348",
    "ButtonText": "#e9e9e6",
    "BrightText": "#ffffff",
    "ToolTipBase": "#3a3d41",
    "ToolTipText": "#f1f1ee",
    "Highlight": "#37739f",
    "HighlightedText": "#ffffff",
    "Link": "#79bdec",
    "LinkVisited": "#c8a5dd",
    "PlaceholderText": "#9da0a3",
    "Light": "#565a60",
    "Midlight": "#494d52",
    "Mid": "#17191b",
    "Dark": "#131416",
    "Shadow": "#0b0c0d",
}

_DISABLED = ("WindowText", "Text", "ButtonText")


def _palette(colours: dict[str, str], disabled: str) -> QPalette:
    palette = QPalette()
    for role, colour in colours.items():
        palette.setColor(QPalette.ColorRole[role], QColor(colour))
    for role in _DISABLED:
        palette.setColor(QPalette.ColorGroup.Disabled, QPalette.ColorRole[role], QColor(disabled))
    return palette


def light_palette() -> QPalette:
    """Dark text on white."""
    return _palette(_LIGHT, "#85888b")


def dark_palette() -> QPalette:
    """Light text on near black."""
    return _palette(_DARK, "#85888b")
