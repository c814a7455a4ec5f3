"""Column matches as text, autosave, and what the bridge does with refused commands."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest
from PySide6.QtGui import QImage
from PySide6.QtWidgets import QMessageBox

from planner.base.errors import CallError
from planner.gui.app.main_window import MainWindow
from planner.gui.models.column_matches import read_matches, write_matches
from planner.gui.pages.sales import SalesPage
from planner.sales.report import LoadedData

pytestmark = pytest.mark.window


def test_matches_are_read_and_written() -> None:
    matches = (("sales", "units", "qty"), ("items", "cost", "landed cost"))
    assert write_matches(matches) == "sales.units=qty, items.cost=landed cost"
    assert read_matches(write_matches(matches)) == matches
    assert read_matches(" , ") == ()
    for wrong in ("units=qty", "sales.units", "sales.=qty", "sales.units="):
        with pytest.raises(CallError, match=r"table\.column"):
            read_matches(wrong)


def test_another_match_loads_again(
    review: MainWindow, demo: LoadedData, wait_idle: Callable[..., None]
) -> None:
    page = review.pages["sales"]
    assert isinstance(page, SalesPage)
    model = page._models["matches"]
    table = model.table()
    pairs = list(zip(table.column("table").values, table.column("column").values, strict=True))
    row = pairs.index(("items", "segment"))
    assert model.setData(model.index(row, model.column_of("their_name")), "brand")
    wait_idle(review)
    loaded = review.bridge.review.loaded
    assert loaded is not None
    assert loaded.request.matches == (("items", "segment", "brand"),)
    brands = {item.brand for item in demo.catalogue.items}
    assert {item.segment for item in loaded.catalogue.items if not item.is_offer} <= brands
    assert page._matches.text() == "items.segment=brand"


def test_a_changed_plan_with_a_file_saves_itself(review: MainWindow, tmp_path: Path) -> None:
    bridge, document = review.bridge, review.bridge.review
    bridge.autosave()
    assert document.path is None
    assert bridge.save(tmp_path / "a.rangewright")
    before = (tmp_path / "a.rangewright").stat().st_mtime_ns
    bridge.autosave()
    assert (tmp_path / "a.rangewright").stat().st_mtime_ns == before
    document.toggle(document.loaded.catalogue.items[0].code)
    assert review.isWindowModified()
    bridge.autosave()
    assert not document.dirty
    assert not review.isWindowModified()
    assert (tmp_path / "a.rangewright").stat().st_mtime_ns > before


def test_a_refused_command_is_shown_and_changes_nothing(review: MainWindow) -> None:
    document = review.bridge.review
    states = document.states
    assert not review.bridge.do(lambda: document.toggle("no such item"))
    box = next(box for box in review.findChildren(QMessageBox) if box.isVisible())
    assert "no such item" in box.text()
    assert document.states is states


@pytest.mark.slow
def test_the_picture_for_the_readme_is_made(tmp_path: Path) -> None:
    script = Path(__file__).parents[2] / "resources" / "window_picture.py"
    target = tmp_path / "window.png"
    subprocess.run([sys.executable, str(script), str(target)], check=True, cwd=script.parents[1])
    image = QImage(str(target))
    assert image.width() >= 1300
    colours = {image.pixelColor(x, y).name() for x in range(0, 1300, 4) for y in range(0, 800, 4)}
    assert len(colours) > 30
