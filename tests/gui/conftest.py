"""The window without a screen, with its own settings file and explicit palettes."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import pytest
from PySide6.QtCore import QLocale, QSettings
from PySide6.QtGui import QPalette
from PySide6.QtWidgets import QApplication

from planner.gui.theme.palettes import dark_palette, light_palette


@pytest.fixture(autouse=True)
def _plain_settings(tmp_path: Path) -> Iterator[None]:
    """Settings in a temporary folder; numbers as in Britain."""
    QSettings.setDefaultFormat(QSettings.Format.IniFormat)
    for scope in (QSettings.Scope.UserScope, QSettings.Scope.SystemScope):
        QSettings.setPath(QSettings.Format.IniFormat, scope, str(tmp_path / "settings"))
    QLocale.setDefault(QLocale(QLocale.Language.English, QLocale.Country.UnitedKingdom))
    yield
    QLocale.setDefault(QLocale.c())


@pytest.fixture(params=["light", "dark"])
def palette(request: pytest.FixtureRequest, qapp: QApplication) -> Iterator[QPalette]:
    """Both palettes, one after the other."""
    before = qapp.palette()
    chosen = light_palette() if request.param == "light" else dark_palette()
    qapp.setPalette(chosen)
    yield chosen
    qapp.setPalette(before)
