"""The window without a screen, with its own settings file and explicit palettes."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Iterator
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
# As the program itself does before it opens the window.
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import pytest
from PySide6.QtCore import QLocale, QSettings
from PySide6.QtGui import QPalette
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from planner.base.paths import demo_folder
from planner.base.progress import NoProgress
from planner.gui.app import start
from planner.gui.app.main_window import MainWindow
from planner.gui.theme.palettes import dark_palette, light_palette
from planner.review import engine
from planner.review.jobs import FitDone, FitJob
from planner.sales.report import LoadedData

_VERDICT = pytest.StashKey[int]()


def pytest_sessionfinish(session: pytest.Session, exitstatus: int) -> None:
    """Remember the verdict for the end."""
    session.config.stash[_VERDICT] = int(exitstatus)


def pytest_unconfigure(config: pytest.Config) -> None:
    """End with the tests' own verdict, all being printed, without Qt's teardown after Python's.

    Once in a while (PySide6 6.11 on Python 3.11) that teardown crashes the finished process.
    """
    if QApplication.instance() is not None and _VERDICT in config.stash:
        sys.stdout.flush()
        sys.stderr.flush()
        os._exit(config.stash[_VERDICT])


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


@pytest.fixture
def window(qtbot: QtBot, qapp: QApplication) -> Iterator[MainWindow]:
    """An empty window; its child process ends with it."""
    start.make_application(["rangewright"])
    made = start.make_window()
    qtbot.addWidget(made, before_close_func=lambda w: w.bridge.review.new())
    made.show()
    qtbot.waitExposed(made)
    yield made
    made.bridge.close()


@pytest.fixture(scope="session")
def demo() -> LoadedData:
    """The demo catalogue, loaded once."""
    return engine.run_load_folder(demo_folder(), NoProgress())


@pytest.fixture(scope="session")
def fit(demo: LoadedData) -> FitDone:
    """A fit of the demo, done once."""
    return engine.run_fit(FitJob(demo), NoProgress())


@pytest.fixture
def review(window: MainWindow, demo: LoadedData, fit: FitDone) -> MainWindow:
    """The window with the demo loaded and fitted."""
    window.bridge.review.accept_loaded(demo)
    window.bridge.review.accept_fitted(fit)
    return window


@pytest.fixture
def wait_idle(qtbot: QtBot) -> Callable[[MainWindow, int], None]:
    """Wait until no job runs."""

    def wait(made: MainWindow, seconds: int = 60) -> None:
        qtbot.waitUntil(lambda: made.bridge.idle, timeout=1000 * seconds)

    return wait
