"""Menus, tool bar and shortcuts: every action of the window in one list."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from PySide6.QtCore import QSize, Qt
from PySide6.QtGui import QAction, QKeySequence, QPalette
from PySide6.QtWidgets import QMainWindow, QMenu, QToolBar

from planner.base.text import _
from planner.gui.theme.icons import icon


@dataclass(frozen=True)
class ActionSpec:
    """key: stable name; menu: which one; text carries the mnemonic; short: text on the tool bar."""

    key: str
    menu: str
    text: str
    shortcut: str = ""
    icon: str = ""
    short: str = ""
    tip: str = ""


def specs() -> tuple[ActionSpec, ...]:
    """All actions, in the order of the menus; an empty key is a separator."""
    line = ActionSpec("", "file", "")
    return (
        ActionSpec("new", "file", _("&New review"), "Ctrl+N"),
        ActionSpec("open", "file", _("&Open a plan…"), "Ctrl+O"),
        ActionSpec(
            "folder", "file", _("Open a &folder…"), "Ctrl+Shift+O", "open", _("Open a folder"),
            _("Open the folder that holds sales, items and whatever else there is"),
        ),
        ActionSpec("demo", "file", _("Open the &demo"), "Ctrl+D"),
        ActionSpec("recent", "file", _("Open &recent")),
        line,
        ActionSpec("save", "file", _("&Save"), "Ctrl+S", "save", _("Save")),
        ActionSpec("save_as", "file", _("Save &as…"), "Ctrl+Shift+S"),
        line,
        ActionSpec(
            "export", "file", _("&Export the workbook…"), "Ctrl+E", "export", _("Export"),
            _("Write the plan as a workbook"),
        ),
        ActionSpec("stores_list", "file", _("Export the s&tores list…"), "Ctrl+Shift+E"),
        line,
        ActionSpec("quit", "file", _("&Quit"), "Ctrl+Q"),
        ActionSpec("undo", "edit", _("&Undo"), "Ctrl+Z", "undo", _("Undo")),
        ActionSpec("redo", "edit", _("&Redo"), "Ctrl+Shift+Z", "redo", _("Redo")),
        ActionSpec("", "edit", ""),
        ActionSpec(
            "take", "edit", _("&Take into the plan"), "Ctrl+T", "take", _("Take into the plan"),
            _("Put the chosen answer or saved plan into the present plan"),
        ),
        ActionSpec("keep", "edit", _("&Keep the plan under a name…"), "Ctrl+K"),
        ActionSpec("today", "edit", _("&Back to today")),
        ActionSpec("fit", "run", _("&Fit the share model"), "F5", "fit", _("Fit the model")),
        ActionSpec("recommend", "run", _("Find the &best plan"), "F6", "run", _("Find the best plan")),
        ActionSpec("cancel", "run", _("&Cancel the running job"), "Esc"),
        ActionSpec("cautions", "help", _("&Cautions")),
        ActionSpec("notes", "help", _("What the figures &rest on")),
        ActionSpec("keys", "help", _("&Keys"), "F1"),
        ActionSpec("about", "help", _("&About Rangewright")),
    )  # fmt: skip


class Actions:
    """Builds menus and tool bar on a window and calls ``handlers[key]``."""

    def __init__(self, window: QMainWindow, handlers: dict[str, Callable[[], object]]) -> None:
        self._window = window
        self._specs = {spec.key: spec for spec in specs() if spec.key}
        self.by_key: dict[str, QAction] = {}
        self.menus: dict[str, QMenu] = {}
        self.recent = QMenu(_("Open &recent"), window)
        titles = {
            "file": _("&File"),
            "edit": _("&Edit"),
            "view": _("&View"),
            "run": _("&Run"),
            "help": _("&Help"),
        }
        for key, title in titles.items():
            menu = window.menuBar().addMenu(title)
            menu.setAccessibleName(title.replace("&", ""))
            self.menus[key] = menu
        for spec in specs():
            self._add(spec, handlers)
        self.bar = QToolBar(_("Tools"), window)
        self._fill_bar()

    def _add(self, spec: ActionSpec, handlers: dict[str, Callable[[], object]]) -> None:
        menu = self.menus[spec.menu]
        if not spec.key:
            menu.addSeparator()
            return
        if spec.key == "recent":
            menu.addMenu(self.recent)
            return
        action = QAction(spec.text, self._window)
        if spec.shortcut:
            action.setShortcut(QKeySequence(spec.shortcut))
        plain = spec.text.replace("&", "").replace("…", "")
        key = QKeySequence(spec.shortcut).toString(QKeySequence.SequenceFormat.NativeText)
        tip = spec.tip or plain
        action.setToolTip(f"{tip} ({key})" if key else tip)
        action.setStatusTip(spec.tip)
        if spec.short:
            action.setIconText(spec.short)
        handler = handlers[spec.key]
        action.triggered.connect(lambda _checked=False: handler())
        menu.addAction(action)
        self.by_key[spec.key] = action

    def _fill_bar(self) -> None:
        self.bar.setObjectName("tools")
        self.bar.setAccessibleName(_("Tools"))
        self.bar.setMovable(False)
        self.bar.setToolButtonStyle(Qt.ToolButtonStyle.ToolButtonTextBesideIcon)
        self.bar.setIconSize(QSize(18, 18))
        groups = (("folder", "save"), ("undo", "redo"), ("fit", "recommend"), ("take", "export"))
        for number, group in enumerate(groups):
            if number:
                self.bar.addSeparator()
            for key in group:
                action = self.by_key[key]
                self.bar.addAction(action)
                button = self.bar.widgetForAction(action)
                button.setAccessibleName(action.text().replace("&", "").replace("…", ""))
                # On the tool bar every button is reached with Tab.
                button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self._window.addToolBar(self.bar)

    def paint_icons(self, palette: QPalette) -> None:
        """Icons in the colours of ``palette``."""
        for key, spec in self._specs.items():
            if spec.icon:
                self.by_key[key].setIcon(icon(spec.icon, palette))
