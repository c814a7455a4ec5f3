"""Starts the window: first the paint, then everything heavy."""

from __future__ import annotations

import multiprocessing
import sys
import threading
from pathlib import Path
from types import TracebackType

from PySide6.QtCore import QEvent, QLocale, QObject, QTimer, Signal
from PySide6.QtWidgets import QApplication, QWidget

from planner import __version__
from planner.base.runner import ChildRunner
from planner.base.text import _
from planner.gui.app.main_window import MainWindow, apply_colours
from planner.gui.app.remembered import Remembered
from planner.gui.app.show_error import show_error
from planner.gui.bridge.review_bridge import ReviewBridge
from planner.gui.theme.icons import program_icon
from planner.review import engine
from planner.review.review import RangeReview


class FirstPaint(QObject):
    """``done`` is sent once, after the window has painted itself for the first time."""

    done = Signal()

    def __init__(self, window: QWidget) -> None:
        super().__init__(window)
        window.installEventFilter(self)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if event.type() == QEvent.Type.Paint:
            watched.removeEventFilter(self)
            QTimer.singleShot(0, self.done.emit)
        return False


def make_application(argv: list[str]) -> QApplication:
    """The one QApplication, with name, icon and colours."""
    running = QApplication.instance()
    app = running if isinstance(running, QApplication) else QApplication(argv)
    app.setApplicationName("Rangewright")
    app.setApplicationDisplayName("Rangewright")
    app.setApplicationVersion(__version__)
    app.setOrganizationName("Rangewright")
    app.setDesktopFileName("rangewright")
    app.setStyle("Fusion")
    app.setWindowIcon(program_icon())
    if QLocale.system().language() == QLocale.Language.C:
        # Without a locale digits would not be grouped and dates not ordered.
        QLocale.setDefault(QLocale(QLocale.Language.English, QLocale.Country.UnitedKingdom))
    return app


def make_window() -> MainWindow:
    """A window with an empty review and its child process (not started yet)."""
    remembered = Remembered()
    apply_colours(remembered.word("colours", "system"))
    bridge = ReviewBridge(RangeReview(), ChildRunner(warm="planner.review.engine:warm_up"))
    return MainWindow(bridge, remembered)


def warm_up(window: MainWindow) -> threading.Thread:
    """After the first paint: start the child, import in a thread what results need here."""
    window.bridge.warm_up()
    thread = threading.Thread(target=engine.warm_window, name="imports", daemon=True)
    thread.start()
    return thread


def open_wanted(window: MainWindow, words: list[str]) -> None:
    """What the command line asked for: the demo, a plan file or a folder."""
    if "--demo" in words:
        window.files.open_demo()
        return
    paths = [word for word in words if not word.startswith("-")]
    if paths:
        window.files.open_path(Path(paths[0]))


def run(argv: list[str]) -> int:
    """Open the window; ``argv`` without the program's name: --demo, a plan file or a folder."""
    multiprocessing.freeze_support()
    app = make_application(["rangewright", *argv])
    window = make_window()

    def unexpected(kind: type[BaseException], error: BaseException, trace: TracebackType | None) -> None:
        sys.__excepthook__(kind, error, trace)
        show_error(window, error)

    sys.excepthook = unexpected
    first = FirstPaint(window)
    first.done.connect(lambda: _after_paint(window, argv))
    window.show()
    try:
        return app.exec()
    finally:
        window.bridge.close()
        sys.excepthook = sys.__excepthook__


def _after_paint(window: MainWindow, argv: list[str]) -> None:
    warm_up(window)
    open_wanted(window, argv)
    window.statusBar().showMessage(_("Ready."), 3000)
