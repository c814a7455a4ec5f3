"""Everything can be reached and named: accessible names, keys, mnemonics, focus."""

from __future__ import annotations

from collections import Counter

import pytest
from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QAbstractButton,
    QAbstractItemView,
    QAbstractScrollArea,
    QAbstractSlider,
    QAbstractSpinBox,
    QComboBox,
    QHeaderView,
    QLabel,
    QLineEdit,
    QTabBar,
    QTabWidget,
    QWidget,
)

from planner.gui.app.main_window import MainWindow
from planner.gui.widgets.lock_dialog import LockDialog
from planner.gui.widgets.tally_bar import TallyBar

pytestmark = pytest.mark.window

_INTERACTIVE = (
    QAbstractButton,
    QAbstractSpinBox,
    QComboBox,
    QLineEdit,
    QAbstractItemView,
    QTabWidget,
    QAbstractSlider,
    TallyBar,
)
_PAGES = ("sales", "evidence", "bench", "best_plan", "saved_plans")


def parts_of_others(widget: QWidget) -> bool:
    """Inner parts that Qt names through the widget they belong to."""
    parent = widget.parentWidget()
    inner = parent is not None and isinstance(
        parent, QAbstractSpinBox | QComboBox | QTabBar | QLineEdit | QAbstractItemView | QAbstractScrollArea
    )
    bars = isinstance(widget, QAbstractSlider | QHeaderView) or widget.objectName().startswith("qt_")
    popup = widget.window().metaObject().className() == "QComboBoxPrivateContainer"
    return inner or bars or popup


def interactive(root: QWidget) -> list[QWidget]:
    found = [w for kind in _INTERACTIVE for w in root.findChildren(kind)]
    return [w for w in found if not parts_of_others(w)]


def test_every_interactive_widget_has_an_accessible_name(review: MainWindow) -> None:
    for page in _PAGES:
        review.show_page(page)
    widgets = interactive(review)
    nameless = [
        f"{type(w).__name__} {w.objectName()} in {type(w.parent()).__name__}"
        for w in widgets
        if not w.accessibleName()
    ]
    assert not nameless
    assert len(widgets) > 60


def test_names_in_the_lock_dialog(review: MainWindow) -> None:
    dialog = LockDialog([("001", "Oat")], ("North",), [("keep", "keep")], review)
    assert [type(w).__name__ for w in interactive(dialog) if not w.accessibleName()] == []
    dialog.choose_item("001")
    assert dialog.answer() == ("001", "keep", "", "", "")


def test_every_interactive_widget_takes_the_focus_by_keyboard(review: MainWindow) -> None:
    for page in _PAGES:
        review.show_page(page)
        for widget in interactive(review.pages[page]):
            if widget.isVisible() and widget.isEnabled() and not isinstance(widget, QTabWidget):
                assert widget.focusPolicy() & Qt.FocusPolicy.TabFocus, (page, widget.accessibleName())


def mnemonic(text: str) -> str:
    at = text.replace("&&", "").find("&")
    return text.replace("&&", "")[at + 1].casefold() if at >= 0 else ""


def mnemonics_of(page: QWidget) -> list[str]:
    texts = [b.text() for b in page.findChildren(QAbstractButton) if b.isVisible()]
    texts += [la.text() for la in page.findChildren(QLabel) if la.isVisible() and la.buddy() is not None]
    for bar in page.findChildren(QTabBar):
        texts += [bar.tabText(i) for i in range(bar.count()) if bar.isVisible() and bar.isTabVisible(i)]
    return [m for m in map(mnemonic, texts) if m]


def test_mnemonics_do_not_clash(review: MainWindow) -> None:
    menus = [mnemonic(action.text()) for action in review.menuBar().actions()]
    for page in _PAGES:
        review.show_page(page)
        counts = Counter([*menus, *mnemonics_of(review.pages[page])])
        assert {m: n for m, n in counts.items() if n > 1} == {}, page
    for menu in review.actions_.menus.values():
        counts = Counter(mnemonic(action.text()) for action in menu.actions() if mnemonic(action.text()))
        assert {m: n for m, n in counts.items() if n > 1} == {}, menu.title()


def test_shortcuts_do_not_clash_and_open_the_pages(review: MainWindow, qtbot: object) -> None:
    keys = [a.shortcut().toString() for a in review.actions_.by_key.values() if not a.shortcut().isEmpty()]
    assert len(keys) == len(set(keys)) > 15
    for number, page in enumerate(_PAGES):
        qtbot.keyClick(review, Qt.Key(Qt.Key.Key_1 + number), Qt.KeyboardModifier.ControlModifier)  # type: ignore[attr-defined]
        assert review.current_page() == page


def test_every_menu_action_has_a_mnemonic(review: MainWindow) -> None:
    for menu in review.actions_.menus.values():
        for action in menu.actions():
            assert action.isSeparator() or mnemonic(action.text()), action.text()
