"""Makes the README's picture: the Bench page on the demo, with a plan of ten changes in it.

    python resources/window_picture.py [TARGET.png]

Runs without a screen.  Real work is done: load, fit, best plan; it takes about half a minute.
"""

from __future__ import annotations

import os
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

from PySide6.QtCore import QSettings
from PySide6.QtTest import QTest

from planner.gui.app.start import make_application, make_window, open_wanted, warm_up

CHANGES = 10
PATIENCE_SECONDS = 120.0


def wait_for(condition: Callable[[], bool], what: str) -> None:
    """Let the window live until the condition holds."""
    end = time.monotonic() + PATIENCE_SECONDS
    while not condition():
        if time.monotonic() > end:
            sys.exit(f"Waited {PATIENCE_SECONDS:.0f} s in vain for: {what}.")
        QTest.qWait(50)


def main() -> None:
    """Do the job and save the picture."""
    target = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent / "window.png"
    QSettings.setDefaultFormat(QSettings.Format.IniFormat)
    QSettings.setPath(
        QSettings.Format.IniFormat, QSettings.Scope.UserScope, tempfile.mkdtemp(prefix="rangewright-")
    )
    os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
    make_application(["rangewright"])
    window = make_window()
    window.resize(1366, 850)
    window.show()
    bridge, review = window.bridge, window.bridge.review
    warm_up(window)
    open_wanted(window, ["--demo"])
    wait_for(lambda: review.loaded is not None and bridge.idle, "loading")
    bridge.fit()
    wait_for(lambda: review.fitted is not None and bridge.idle, "fitting")
    review.set_limits(replace(review.limits, max_changes=CHANGES))
    bridge.recommend(15.0)
    wait_for(lambda: bool(review.plans) and bridge.idle, "the best plan")
    review.take_states(review.plan().states, review.plan().name)
    window.show_page("bench")
    QTest.qWait(1500)
    window.grab().save(str(target))
    bridge.close()


if __name__ == "__main__":
    main()
