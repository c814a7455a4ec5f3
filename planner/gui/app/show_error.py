"""The one place where the window shows an error: what happened, where, what to do."""

from __future__ import annotations

import traceback

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QMessageBox, QWidget

from planner.base.errors import RangewrightError
from planner.base.text import _


def show_error(parent: QWidget | None, error: BaseException) -> QMessageBox:
    """Open a message that does not block the window."""
    box = QMessageBox(parent)
    box.setIcon(QMessageBox.Icon.Warning)
    box.setWindowTitle(_("Rangewright"))
    box.setTextFormat(Qt.TextFormat.PlainText)
    box.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
    box.setTextInteractionFlags(
        Qt.TextInteractionFlag.TextSelectableByMouse | Qt.TextInteractionFlag.TextSelectableByKeyboard
    )
    if isinstance(error, RangewrightError):
        box.setText(error.problem[:1].upper() + error.problem[1:])
        parts = []
        if error.place:
            parts.append(_("Where: {place}.").format(place=error.place.rstrip(".")))
        if error.remedy:
            parts.append(_("What to do: {remedy}").format(remedy=error.remedy))
        box.setInformativeText("\n\n".join(parts))
        if error.report:
            box.setDetailedText(error.report)
        if error.report:
            box.setDetailedText(error.report)
    else:
        box.setText(_("Something went wrong inside the program: {error}").format(error=error))
        box.setInformativeText(
            _(
                "Your files are unchanged, and the plan is as it was before the last step. "
                "Save the plan; if it happens again, send the details below to whoever looks after "
                "the program."
            )
        )
        box.setDetailedText("".join(traceback.format_exception(error)))
    box.setAccessibleName(_("Error message"))
    box.setStandardButtons(QMessageBox.StandardButton.Ok)
    box.open()
    return box
