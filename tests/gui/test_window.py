"""The window does the whole main job, with mouse and keys, jobs in the child process."""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import openpyxl
import pytest
from PySide6.QtCore import QEvent, QMimeData, QObject, QPoint, QPointF, Qt, QUrl
from PySide6.QtGui import QCloseEvent, QDropEvent
from PySide6.QtWidgets import QApplication, QFileDialog, QInputDialog, QMessageBox
from pytestqt.qtbot import QtBot

from planner.base.paths import demo_folder
from planner.gui.app import start
from planner.gui.app.main_window import MainWindow
from planner.gui.pages.bench import BenchPage
from planner.gui.pages.sales import SalesPage
from planner.gui.widgets.bar_list import BarList
from planner.gui.widgets.table_view import TableView
from planner.sales.report import LoadedData

pytestmark = pytest.mark.window

Wait = Callable[..., None]


def alive(process_id: int) -> bool:
    """Does this process exist?"""
    try:
        os.kill(process_id, 0)
    except ProcessLookupError:
        return False
    return True


def bench_of(window: MainWindow) -> tuple[BenchPage, TableView]:
    page = window.pages["bench"]
    assert isinstance(page, BenchPage)
    view = next(v for v in page.findChildren(TableView) if v.accessibleName() == "Items by segment")
    return page, view


def said(window: MainWindow) -> list[QMessageBox]:
    return [box for box in window.findChildren(QMessageBox) if box.isVisible()]


def test_the_main_job_from_loading_to_the_workbook(
    window: MainWindow, qtbot: QtBot, wait_idle: Wait, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    review = window.bridge.review
    began = time.perf_counter()
    window.bridge.warm_up()
    window.actions_.by_key["demo"].trigger()
    assert window.strip.isVisible()
    wait_idle(window)
    print(f"demo opened and shown in {time.perf_counter() - began:.2f} s, child started on the way")
    assert review.loaded is not None
    assert "Fit the share model" in window.tally.accessibleDescription()

    window.show_page("evidence")
    window.actions_.by_key["fit"].trigger()
    wait_idle(window, 120)
    assert review.fitted is not None
    before = window.tally.accessibleDescription()

    window.show_page("bench")
    _page, view = bench_of(window)
    view.setFocus()
    item = view.current_identity()
    qtbot.keyClick(view, Qt.Key.Key_Space)
    assert review.can_undo
    assert window.tally.accessibleDescription() != before
    qtbot.keyClick(window, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    assert window.tally.accessibleDescription() == before
    assert view.current_identity() == item

    window.show_page("best_plan")
    window.best_plan._form._seconds.setValue(2)
    window.best_plan._form._changes.setValue(4)
    window.actions_.by_key["recommend"].trigger()
    wait_idle(window, 60)
    assert not said(window)
    found = review.plans[-1]
    assert found.outcome is not None
    assert found.outcome.bound >= found.outcome.value - 1e-6
    assert int((found.states != review.today_states()).sum()) <= 4

    window.actions_.by_key["take"].trigger()
    assert np.array_equal(review.states, found.states)
    assert "4 changes" in window.tally.accessibleDescription() or found.outcome.value > 0.0
    monkeypatch.setattr(QInputDialog, "getText", staticmethod(lambda *_a, **_k: ("Spring", True)))
    window.actions_.by_key["keep"].trigger()
    assert review.plans[-1].name == "Spring"

    target = tmp_path / "spring.xlsx"
    monkeypatch.setattr(QFileDialog, "exec", lambda _self: 1)
    monkeypatch.setattr(QFileDialog, "selectedFiles", lambda _self: [str(target)])
    window.actions_.by_key["export"].trigger()
    wait_idle(window, 60)
    assert not said(window)
    book = openpyxl.load_workbook(target)
    texts = {str(cell.value) for sheet in book for row in sheet.iter_rows() for cell in row if cell.value}
    assert len(book.sheetnames) >= 4
    assert review.loaded.catalogue.items[0].code in texts

    plan = tmp_path / "spring.rangewright"
    assert window.bridge.save(plan)
    assert not window.isWindowModified()
    assert window.windowTitle().startswith("spring")
    window.bridge.review.new()
    assert window.bridge.open(plan)
    assert [kept.name for kept in review.plans] == [found.name, "Spring"]
    assert np.array_equal(review.states, found.states)


class _Paints(QObject):
    """Notes when the widgets it watches have painted."""

    def __init__(self) -> None:
        super().__init__()
        self.at: dict[QObject, float] = {}

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if event.type() == QEvent.Type.Paint:
            self.at[watched] = time.perf_counter()
        return False


def test_a_tick_repaints_numbers_and_bars_at_once(
    review: MainWindow, qapp: QApplication, qtbot: QtBot
) -> None:
    review.show_page("bench")
    page, view = bench_of(review)
    bars = page.findChild(BarList)
    page._scope.setCurrentIndex(1)
    qapp.processEvents()
    watched = [view.viewport(), bars.viewport(), review.tally]
    paints = _Paints()
    for widget in watched:
        widget.installEventFilter(paints)
    model = page._model
    items = [model.identity_of(row) for row in range(model.rowCount()) if model.identity_of(row)]
    spent = []
    for item in items[:40]:
        view.choose(item)  # what is not in sight is not painted
        qtbot.wait(40)
        paints.at.clear()
        began = time.perf_counter()
        page.toggle(item)
        while len(paints.at) < 3 and time.perf_counter() - began < 5.0:
            qapp.processEvents()
        assert len(paints.at) == 3
        spent.append(1000.0 * (max(paints.at.values()) - began))
    p95 = statistics.quantiles(spent, n=20)[-1]
    print(f"tick to painted: median {statistics.median(spent):.0f} ms, 95 % {p95:.0f} ms")
    # Goal 100 ms; a shared machine may be five times slower.
    assert p95 < 500.0


def test_ticking_changes_the_item_and_undo_takes_it_back(review: MainWindow, qtbot: QtBot) -> None:
    review.show_page("bench")
    page, view = bench_of(review)
    document = review.bridge.review
    today = document.today_states()
    row = next(r for r in range(1, 20) if page._model.identity_of(r))
    item = page._model.identity_of(row)
    j = document.loaded.catalogue.item_index()[item]
    box = view.visualRect(page._model.index(row, 0))
    where = QPoint(box.left() + 12, box.center().y())
    qtbot.mouseClick(view.viewport(), Qt.MouseButton.LeftButton, pos=where)
    assert (document.states[:, j] == 0).all()
    assert page._model.cell(row, 0).text == "out"
    assert page._model.cell(row, 0).strong
    assert view.current_identity() == item
    assert any(bar.identity == item and bar.value < 0 for bar in page._bars.rows())
    review.actions_.by_key["undo"].trigger()
    assert np.array_equal(document.states, today)
    review.actions_.by_key["redo"].trigger()
    assert (document.states[:, j] == 0).all()
    assert "Delist" in review.actions_.by_key["undo"].text()


def test_one_cluster_is_changed_alone(review: MainWindow) -> None:
    review.show_page("bench")
    page, view = bench_of(review)
    document = review.bridge.review
    page._cluster.setCurrentIndex(2)
    item = page._model.identity_of(1)
    page.toggle(item)
    changed = document.states != document.today_states()
    assert changed.sum() == 1
    assert changed[1].any()
    page._lock("keep")
    assert document.limits.locks[0].cluster == document.loaded.catalogue.clusters[1]
    view.choose(item)
    page._lock("")
    assert not document.limits.locks


def test_every_page_shows_its_data_in_both_palettes(review: MainWindow, palette: object) -> None:
    for page in review.pages:
        review.show_page(page)
        QApplication.processEvents()
        image = review.grab().toImage()
        colours = {
            image.pixelColor(x, y).name() for x in range(0, image.width(), 3) for y in range(0, 700, 3)
        }
        assert len(colours) > 12, page
        for view in review.pages[page].findChildren(TableView):
            if view.isVisible() and view.accessibleName() not in ("Locks", "What the chosen plan changes"):
                assert view.model().rowCount() > 0, view.accessibleName()


def test_receivers_follow_item_measure_and_scope(review: MainWindow) -> None:
    review.show_page("bench")
    page, view = bench_of(review)
    view.choose(page._model.identity_of(2))
    page._show_receivers()
    units = page._bars.rows()
    assert units[0].kind == "heading"
    assert next(r for r in units if r.kind == "leaves").value > 0.0
    assert {r.label for r in units if r.kind == "total"} >= {"Own label", "Brands"}
    assert all(r.interval for r in units if r.kind != "heading")
    page._measure.setCurrentIndex(2)
    assert page._bars.rows() != units
    page._scope.setCurrentIndex(1)
    assert "as today" in page._caption.text()


def test_cancel_ends_a_job_and_keeps_what_was_there(
    window: MainWindow, demo: LoadedData, qtbot: QtBot, wait_idle: Wait
) -> None:
    window.bridge.review.accept_loaded(demo)
    window.bridge.warm_up()
    assert window.bridge.fit("nested")
    assert not window.bridge.fit("nested")  # one job at a time, and the refusal is shown
    assert len(said(window)) == 1
    said(window)[0].accept()
    window.activateWindow()
    with qtbot.waitActive(window):
        pass
    with qtbot.waitSignal(window.bridge.progress, timeout=60_000):
        pass
    began = time.perf_counter()
    qtbot.keyClick(window, Qt.Key.Key_Escape)
    with qtbot.waitSignal(window.bridge.cancelled, timeout=20_000):
        pass
    spent = time.perf_counter() - began
    print(f"cancelled in {1000 * spent:.0f} ms")
    # Goal 0.5 s; a shared machine may be five times slower.
    assert spent < 2.5
    assert window.bridge.idle
    assert window.bridge.review.loaded is demo
    assert window.bridge.review.fitted is None


def test_stop_keeps_the_best_plan_so_far(review: MainWindow, qtbot: QtBot, wait_idle: Wait) -> None:
    review.show_page("best_plan")
    review.best_plan._form._changes.setValue(8)
    review.best_plan._form._seconds.setValue(600)
    review.best_plan._run.click()
    with qtbot.waitSignal(review.bridge.improved, timeout=120_000):
        pass
    review.best_plan._stop.click()
    wait_idle(review)
    assert not said(review)
    assert review.bridge.review.plans[-1].outcome is not None
    assert review.bridge.proposal is not None


def test_closing_leaves_no_child_process(window: MainWindow) -> None:
    window.bridge.warm_up()
    child = window.bridge._runner.process_id
    assert child is not None
    assert alive(child)
    window.close()
    assert not alive(child)


def test_unsaved_changes_are_asked_about(review: MainWindow, monkeypatch: pytest.MonkeyPatch) -> None:
    asked: list[str] = []

    def answer(box: QMessageBox) -> QMessageBox.StandardButton:
        asked.append(box.text())
        return QMessageBox.StandardButton.Cancel

    monkeypatch.setattr(QMessageBox, "exec", answer)
    event = QCloseEvent()
    review.closeEvent(event)
    assert len(asked) == 1
    assert not event.isAccepted()


def test_a_folder_without_sales_is_refused_in_words(
    window: MainWindow, wait_idle: Wait, tmp_path: Path
) -> None:
    (tmp_path / "notes.txt").write_text("nothing here", encoding="utf-8")
    window.bridge.load_folder(tmp_path, "Opening")
    wait_idle(window)
    box = said(window)[0]
    assert box.text()
    assert "What to do:" in box.informativeText()
    assert window.bridge.review.loaded is None


def drop(window: MainWindow, paths: list[Path]) -> None:
    mime = QMimeData()
    mime.setUrls([QUrl.fromLocalFile(str(path)) for path in paths])
    event = QDropEvent(
        QPointF(10, 10),
        Qt.DropAction.CopyAction,
        mime,
        Qt.MouseButton.LeftButton,
        Qt.KeyboardModifier.NoModifier,
    )
    window.dropEvent(event)


def test_dropped_files_are_put_in_their_rows_and_loaded(window: MainWindow, wait_idle: Wait) -> None:
    folder = demo_folder()
    drop(window, [folder / "items.csv", folder / "stores.csv", folder / "sales.csv.gz"])
    page = window.pages["sales"]
    assert isinstance(page, SalesPage)
    assert page._files.path("stores") == folder / "stores.csv"
    wait_idle(window)
    assert not said(window)
    loaded = window.bridge.review.loaded
    assert loaded is not None
    assert loaded.request.shoppers is None


def test_a_dropped_folder_is_loaded_and_remembered(window: MainWindow, wait_idle: Wait) -> None:
    drop(window, [demo_folder()])
    wait_idle(window)
    assert window.bridge.review.loaded is not None
    assert window.remembered.recent() == [str(demo_folder().resolve())]
    window._fill_recent()
    assert window.actions_.recent.actions()[0].text() == str(demo_folder().resolve())


def test_layout_and_recent_files_come_back(window: MainWindow, qtbot: QtBot, tmp_path: Path) -> None:
    window.resize(950, 700)
    bench = window.pages["bench"]
    assert isinstance(bench, BenchPage)
    bench._split.setSizes([500, 250])
    kept = bench.kept_state()
    window.remembered.add_recent(tmp_path)
    window.remembered.add_recent(tmp_path / "gone.rangewright")
    window.close()
    again = start.make_window()
    qtbot.addWidget(again)
    # The screen of these tests is narrower than the window, so only the height comes back whole.
    assert again.height() == 700
    assert again.remembered.recent() == [str(tmp_path)]
    assert again.remembered.bytes_of("pages/bench") == kept
    assert again.pages["bench"].kept_state() == kept
    again.bridge.close()


def test_empty_pages_say_what_to_do(window: MainWindow) -> None:
    for page in ("evidence", "bench", "best_plan", "saved_plans"):
        window.show_page(page)
        assert window.pages[page].empty.isVisible()
        assert not window.pages[page].content.isVisible()
    for action in ("save", "export", "fit", "recommend", "take", "undo"):
        assert not window.actions_.by_key[action].isEnabled()


def test_limits_are_typed_and_refused(review: MainWindow) -> None:
    review.show_page("best_plan")
    form, document = review.best_plan._form, review.bridge.review
    model = form._clusters
    cluster = document.loaded.catalogue.clusters[0]
    row = model.row_of(cluster)
    index = model.index(row, model.column_of("max_items"))
    assert model.setData(index, "40")
    assert document.limits.clusters[0].max_items == 40
    assert model.data(index) == "40"
    assert model.setData(index, "4.5")
    assert "whole number" in said(review)[0].text()
    assert document.limits.clusters[0].max_items == 40
    assert model.setData(index, "")
    assert document.limits.clusters == ()
    form._changes.setValue(7)
    assert document.limits.max_changes == 7
    document.undo()
    assert form._changes.value() == -1


def test_reasons_are_kept_beside_decisions(review: MainWindow) -> None:
    document, page = review.bridge.review, review.saved_plans
    item = document.loaded.catalogue.items[0].code
    document.toggle(item)
    review.show_page("saved_plans")
    row = next(r for r in range(page._items.rowCount()) if item in page._items.identity_of(r))
    index = page._items.index(row, page._items.column_of("reason"))
    assert page._items.setData(index, "slow and dear")
    assert document.reasons[0][2] == "slow and dear"
    document.keep_plan("One", document.states)
    document.back_to_today()
    page._view.choose("One")
    assert review.bridge.proposal.label == "One"
    review.actions_.by_key["take"].trigger()
    assert (document.states != document.today_states()).any()
    page._drop_chosen()
    assert not document.plans


def test_the_page_of_sales_shows_what_was_read(review: MainWindow, demo: LoadedData) -> None:
    page = review.pages["sales"]
    assert isinstance(page, SalesPage)
    assert f"{demo.report.rows_used:,}" in page._summary.text()
    assert page._coverage.accessibleDescription().startswith(
        str(int(demo.panel.listed.any(axis=0).sum())) + " items"
    )
    assert page._models["reconciliation"].rowCount() >= 2


def test_help_shows_cautions_and_keys(review: MainWindow) -> None:
    for key in ("cautions", "notes", "keys", "about"):
        review.actions_.by_key[key].trigger()
    from_menu = [w for w in review.findChildren(QObject) if w.metaObject().className() == "QDialog"]
    assert len(from_menu) == 4
    for dialog in from_menu:
        dialog.reject()  # type: ignore[attr-defined]


def test_the_heavy_parts_wait_for_the_first_paint(window: MainWindow, qtbot: QtBot) -> None:
    first = start.FirstPaint(window)
    with qtbot.waitSignal(first.done, timeout=5000):
        window.update()
    told: list[int] = []
    first.done.connect(lambda: told.append(1))
    window.repaint()
    qtbot.wait(20)
    assert not told


def test_starting_brings_in_nothing_heavy() -> None:
    words = (
        "import sys, planner.gui.app.start; "
        "print([m for m in ('pandas', 'scipy', 'matplotlib', 'pyarrow', 'openpyxl', 'highspy') "
        "if m in sys.modules])"
    )
    found = subprocess.run([sys.executable, "-c", words], capture_output=True, text=True, check=True)
    assert found.stdout.strip() == "[]"


def test_first_window_stands_within_a_second(tmp_path: Path) -> None:
    words = (
        "import time; began = time.perf_counter()\n"
        "from planner.gui.app import start\n"
        "app = start.make_application(['rangewright']); window = start.make_window()\n"
        "window.show(); app.processEvents()\n"
        "print(time.perf_counter() - began)\n"
    )
    environment = {**os.environ, "QT_QPA_PLATFORM": "offscreen", "XDG_CONFIG_HOME": str(tmp_path)}
    times = []
    for _run in range(2):
        found = subprocess.run(
            [sys.executable, "-c", words], capture_output=True, text=True, check=True, env=environment
        )
        times.append(float(found.stdout.split()[-1]))
    print(f"first window after {min(times):.2f} s, imports included")
    # Goal 1 s; a shared machine may be five times slower.
    assert min(times) < 5.0
