"""Where the program finds its own files, in a checkout and in an installed wheel."""

from __future__ import annotations

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent.parent


def _folder(installed: str, checkout: str) -> Path:
    inside = _PACKAGE / installed
    return inside if inside.is_dir() else _PACKAGE.parent / checkout


def resources_folder() -> Path:
    """Icons, styles, translations."""
    return _folder("_resources", "resources")


def demo_folder() -> Path:
    """The demo catalogue's input files."""
    return _folder("_demo", "demo_catalog")
