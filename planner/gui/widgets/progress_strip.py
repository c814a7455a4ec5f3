"""The running job: its name and step, how far, how long, and Cancel."""

from __future__ import annotations

import time

from PySide6.QtCore import QTimer, Signal
from PySide6.QtWidgets import QHBoxLayout, QLabel, QProgressBar, QPushButton, QWidget

from planner.base.text import _
from planner.gui.theme.numbers import duration, percent

_TICK_MS = 500


class ProgressStrip(QWidget):
    """Hidden while nothing runs.  ``cancelled`` is sent by the button."""

    cancelled = Signal()

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._started = 0.0
        self._job = ""
        self._label = QLabel()
        self._label.setAccessibleName(_("Running job"))
        self._bar = QProgressBar()
        self._bar.setAccessibleName(_("Progress of the job"))
        self._bar.setFixedWidth(180)
        self._bar.setTextVisible(False)
        self._time = QLabel()
        self._time.setAccessibleName(_("Elapsed time"))
        self._cancel = QPushButton(_("Canc&el"))
        self._cancel.setAccessibleName(_("Cancel the running job"))
        self._cancel.setToolTip(_("Cancel the running job (Esc)"))
        self._cancel.clicked.connect(self.cancelled)
        row = QHBoxLayout(self)
        row.setContentsMargins(8, 2, 8, 2)
        row.addWidget(self._label, 1)
        row.addWidget(self._bar)
        row.addWidget(self._time)
        row.addWidget(self._cancel)
        self._clock = QTimer(self)
        self._clock.setInterval(_TICK_MS)
        self._clock.timeout.connect(self._tick)
        self.hide()

    def start(self, job: str) -> None:
        """A job has begun."""
        self._job, self._started = job, time.monotonic()
        self._label.setText(job)
        self._bar.setRange(0, 0)
        self._cancel.setEnabled(True)
        self._fraction: float | None = None
        self._tick()
        self._clock.start()
        self.show()

    def report(self, step: str, fraction: float | None) -> None:
        """The job's step and how far it is (0..1)."""
        self._fraction = fraction
        self._label.setText(
            _("{job}: {step}").format(job=self._job, step=step) if step not in ("", self._job) else self._job
        )
        if fraction is None:
            self._bar.setRange(0, 0)
        else:
            self._bar.setRange(0, 1000)
            self._bar.setValue(round(1000.0 * fraction))
        self._tick()

    def stopping(self) -> None:
        """The user has cancelled; the job is ending."""
        self._cancel.setEnabled(False)
        self._label.setText(_("{job}: stopping").format(job=self._job))

    def finish(self) -> None:
        """Nothing runs any more."""
        self._clock.stop()
        self.hide()

    def _tick(self) -> None:
        elapsed = duration(time.monotonic() - self._started)
        if self._fraction is None:
            self._time.setText(elapsed)
        else:
            part = percent(self._fraction)
            self._time.setText(_("{part}, {elapsed}").format(part=part, elapsed=elapsed))
