"""Tables as item models, without a window."""

from __future__ import annotations

import math
import time
from dataclasses import replace

import numpy as np
import pytest
from PySide6.QtCore import QAbstractItemModel, QPersistentModelIndex, Qt

from planner.gui.models.table_model import Look, TableModel, two_lines
from planner.tables.table import Column, Table

pytestmark = pytest.mark.window


def small(margin: tuple[float, ...] = (12.5, -3.0, math.nan, 1234.567), name: str = "=1+1") -> Table:
    return Table(
        "bench",
        "Bench",
        (
            Column("item", "Item", "text", ("001", "002", "003", "004")),
            Column("description", "Description", "text", ("Oat mild", name, "Barley", "Ärmel")),
            Column("segment", "Segment", "text", ("flakes", "meal", "flakes", "meal")),
            Column("margin", "Margin lost if delisted", "money", margin, unit="per week", decimals=1),
            Column("low", "low", "money", (10.0, -5.0, math.nan, 1000.0)),
            Column("high", "high", "money", (15.0, 1.0, math.nan, 1500.0)),
            Column("share", "Share", "percent", (0.5, None, 0.25, 1.0)),
            Column("in_plan", "In plan", "flag", (True, False, None, True)),
            Column("plan", "Plan", "text", ("in", "out", "as today", "in")),
        ),
    )


LOOKS = {
    "margin": Look(bar=True, low="low", high="high"),
    "plan": Look(check="in_plan"),
    "description": Look(editable=True),
}


def made(group: str = "") -> TableModel:
    model = TableModel(LOOKS, identity="item", group=group)
    model.set_table(small())
    return model


def texts(model: QAbstractItemModel, key: str) -> list[str]:
    position = model.keys().index(key)  # type: ignore[attr-defined]
    return [str(model.index(row, position).data()) for row in range(model.rowCount())]


def test_formats_and_hidden_columns() -> None:
    model = made()
    assert model.keys() == ("item", "description", "segment", "margin", "share", "plan")
    assert texts(model, "margin") == ["12.5", "−3.0", "", "1,234.6"]
    assert texts(model, "share") == ["50 %", "", "25 %", "100 %"]
    bar = model.cell(1, model.column_of("margin")).bar
    assert bar is not None
    assert (bar.value, bar.low, bar.high, bar.bottom, bar.top) == (-3.0, -5.0, 1.0, -5.0, 1500.0)
    assert model.cell(2, model.column_of("margin")).bar is None


def test_tester_finds_nothing(qtmodeltester: object) -> None:
    for model in (made(), made(group="segment")):
        qtmodeltester.check(model)  # type: ignore[attr-defined]


def test_sort_keeps_persistent_indexes_and_puts_blanks_last() -> None:
    model = made()
    kept = QPersistentModelIndex(model.index(3, 1))
    model.sort(model.column_of("margin"), Qt.SortOrder.DescendingOrder)
    assert texts(model, "item") == ["004", "001", "002", "003"]
    assert (kept.row(), kept.data()) == (0, "Ärmel")
    model.sort(model.column_of("margin"), Qt.SortOrder.AscendingOrder)
    assert texts(model, "item") == ["002", "001", "004", "003"]
    assert kept.data() == "Ärmel"
    model.sort(-1)
    assert texts(model, "item") == ["001", "002", "003", "004"]


def test_groups_have_headings_and_sort_inside() -> None:
    model = made(group="segment")
    assert texts(model, "item") == ["flakes  ·  2 items", "001", "003", "meal  ·  2 items", "002", "004"]
    assert model.heading_rows() == [0, 3]
    model.sort(model.column_of("item"), Qt.SortOrder.DescendingOrder)
    assert [model.identity_of(row) for row in range(6)] == ["", "003", "001", "", "004", "002"]
    assert not model.flags(model.index(0, 0)) & Qt.ItemFlag.ItemIsSelectable


def test_filter_and_mask() -> None:
    model = made()
    model.filter("oat MILD")
    assert texts(model, "item") == ["001"]
    assert (model.row_of("001"), model.row_of("002")) == (0, -1)
    model.filter("")
    model.set_mask(np.array([False, True, True, False]))
    assert texts(model, "item") == ["002", "003"]


def test_changed_values_keep_the_order_and_tell_their_rows(qtbot: object) -> None:
    model = made()
    model.sort(model.column_of("margin"), Qt.SortOrder.DescendingOrder)
    told: list[tuple[int, int]] = []
    resets: list[int] = []
    model.dataChanged.connect(lambda first, last: told.append((first.row(), last.row())))
    model.modelReset.connect(lambda: resets.append(1))
    model.set_table(small(margin=(9999.0, -3.0, 7.0, 1.0)))
    assert texts(model, "item") == ["004", "001", "002", "003"]
    assert texts(model, "margin") == ["1.0", "9,999.0", "−3.0", "7.0"]
    assert told == [(0, 0), (1, 1), (2, 2), (3, 3)]  # the scale of the bars has changed
    table = model.table()
    plan = [
        replace(c, values=("in", "in", "as today", "in")) if c.key == "plan" else c for c in table.columns
    ]
    told.clear()
    model.set_table(replace(table, columns=tuple(plan)))
    assert told == [(model.row_of("002"), model.row_of("002"))]
    assert not resets


def test_boxes_and_editing_are_told_not_done(qtbot: object) -> None:
    model = made()
    ticked: list[str] = []
    typed: list[tuple[str, str, str]] = []
    model.checked.connect(ticked.append)
    model.typed.connect(lambda *parts: typed.append(parts))
    plan = model.column_of("plan")
    assert model.cell(2, plan).check == Qt.CheckState.PartiallyChecked
    assert model.setData(model.index(0, plan), None, Qt.ItemDataRole.CheckStateRole)
    assert model.setData(model.index(1, 1), " new ", Qt.ItemDataRole.EditRole)
    assert not model.setData(model.index(1, 0), "new", Qt.ItemDataRole.EditRole)
    assert ticked == ["001"]
    assert typed == [("002", "description", "new")]
    assert texts(model, "description")[1] == "=1+1"


def test_copy_is_tsv_and_html_and_no_formula() -> None:
    model = made()
    mime = model.mimeData([model.index(1, 0), model.index(1, 1), model.index(1, 3)])
    assert mime.text() == "Item\tDescription\tMargin lost if delisted (per week)\n002\t'=1+1\t-3.0\n"
    assert "<td>&#x27;=1+1</td>" in mime.html()
    assert len(model.mimeData([]).text().splitlines()) == 5


def test_two_thousand_rows_sort_and_filter_within_a_tenth_of_a_second() -> None:
    rng = np.random.default_rng(5)
    n = 2000
    columns = [Column("item", "Item", "text", [f"item {k:05d}" for k in range(n)])]
    columns += [
        Column(f"c{k}", f"Column {k}", "number", rng.normal(size=n).tolist(), decimals=2) for k in range(19)
    ]
    model = TableModel(identity="item")
    model.set_table(Table("big", "Big", tuple(columns)))
    spent = {}
    for what in ("sort", "filter"):
        start = time.perf_counter()
        model.sort(7, Qt.SortOrder.DescendingOrder) if what == "sort" else model.filter("item 01")
        spent[what] = time.perf_counter() - start
    print({what: f"{1000 * seconds:.0f} ms" for what, seconds in spent.items()})
    # Goal 0.1 s; a shared machine may be five times slower.
    assert max(spent.values()) < 0.5
    assert model.rowCount() == sum("01" in f"item {k:05d}" for k in range(n))


def test_long_titles_break_near_the_middle() -> None:
    assert two_lines("Margin lost if delisted") == "Margin lost\nif delisted"
    assert two_lines("Item") == "Item"
