"""The workbook read back: sheets, cells, formulas, texts that stay texts, no costs unless wanted."""

from __future__ import annotations

import re
import shutil
import subprocess
import zipfile
from collections.abc import Iterator
from dataclasses import replace
from datetime import datetime
from pathlib import Path

import numpy as np
import pytest
from openpyxl import load_workbook
from openpyxl.cell.cell import Cell
from openpyxl.workbook import Workbook
from openpyxl.worksheet.worksheet import Worksheet

from planner.base.errors import CallError
from planner.export.meanings import meaning
from planner.export.workbook import write_workbook
from planner.plan.limits import Limits
from planner.sales.report import LoadedData
from planner.tables.bench import bench_table
from planner.tables.limits import limits_table
from planner.tables.names import changed_pairs
from planner.tables.plan import cluster_of, item_list_table
from planner.tables.receivers import receivers_table
from planner.tables.sales import reconciliation_table
from planner.tables.table import Table
from planner.tables.tally import tally_table
from planner.transfer.delistings import delistings
from planner.transfer.tally import Tally, tally
from tests.tables import records

SHEETS = [
    "Summary", "Item list", "Where sales go", "Single delistings", "Ladder", "Limits", "Sales data",
    "What the figures mean",
]  # fmt: skip


@pytest.fixture(scope="module")
def path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    target = tmp_path_factory.mktemp("workbook") / "plan.xlsx"
    write_workbook(target, records.loaded(), records.fitted(), records.plan())
    return target


@pytest.fixture(scope="module")
def book(path: Path) -> Workbook:
    return load_workbook(path)


def cells(book: Workbook) -> Iterator[tuple[str, Cell]]:
    for sheet in book.worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                if cell.value is not None:
                    yield sheet.title, cell


def header_row(sheet: Worksheet, first: str) -> int:
    for row in range(1, sheet.max_row + 1):
        if sheet.cell(row, 1).value == first and sheet.cell(row, 2).value is not None:
            return row
    raise AssertionError(f"no header {first!r} on {sheet.title}")


def compare(sheet: Worksheet, table: Table, keys: list[str], header: int) -> None:
    """Every value of the table stands on the sheet under its title, row by row."""
    titles = {str(sheet.cell(header, c).value): c for c in range(1, sheet.max_column + 1)}
    for key in keys:
        column = table.column(key)
        place = next(c for title, c in titles.items() if title.split(" (")[0] == column.title)
        for k, value in enumerate(column.values):
            cell = sheet.cell(header + 1 + k, place)
            if value is None or value == "":
                assert cell.value in (None, "")
            elif column.kind == "flag":
                assert cell.value == ("yes" if value else "no")
            elif column.kind == "text":
                assert cell.value == value
                assert cell.data_type == "s"
            else:
                assert cell.value == pytest.approx(float(str(value)), rel=1e-12, abs=1e-12)
                assert cell.data_type == "n"


def figures() -> Tally:
    return tally(records.fitted(), records.base_week(), records.planned())


def test_sheets(book: Workbook) -> None:
    assert book.sheetnames == SHEETS


def test_item_list_equals_the_table(book: Workbook) -> None:
    data, plan = records.loaded(), records.plan()
    table = item_list_table(data, figures().effects, plan.states, plan.reasons)
    sheet = book["Item list"]
    keys = [column.key for column in table.columns]
    compare(sheet, table, keys, header_row(sheet, "Cluster"))
    actions = [
        row[0].value
        for row in sheet.iter_rows(min_row=header_row(sheet, "Cluster") + 1, min_col=2, max_col=2)
    ]
    assert actions[:2] == ["list", "delist"]


def test_where_sales_go_equals_the_table(book: Workbook) -> None:
    data = records.loaded()
    changed = changed_pairs(data.base.today, cluster_of(data), records.planned())
    table = receivers_table(data, figures().effects, changed=changed)
    sheet = book["Where sales go"]
    keys = [
        "item",
        "description",
        "before",
        "after",
        "change",
        "low",
        "high",
        "share",
        "share_low",
        "share_high",
    ]
    compare(sheet, table, keys, header_row(sheet, "Kind"))


def test_other_sheets_equal_their_tables(book: Workbook) -> None:
    data, fitted, plan = records.loaded(), records.fitted(), records.plan()
    bench = bench_table(data, fitted, delistings(fitted, data.base), plan.states)
    keys = ["item", "plan", "price", "margin", "stays", "stays_low", "margin_lost", "margin_lost_high"]
    compare(book["Single delistings"], bench, keys, header_row(book["Single delistings"], "Segment"))
    limits = limits_table(data, plan.limits, plan.states)
    compare(
        book["Limits"],
        limits,
        ["limit", "where", "value", "used", "room", "met"],
        header_row(book["Limits"], "Limit"),
    )
    sales = book["Sales data"]
    compare(
        sales,
        reconciliation_table(data.report),
        ["what", "rows", "money", "share"],
        header_row(sales, "What"),
    )
    summary = book["Summary"]
    table = tally_table(data, figures())
    compare(
        summary,
        table,
        ["measure", "today", "plan", "change", "low", "high", "limit"],
        header_row(summary, "Measure"),
    )


def test_summary_says_the_interval_first_and_the_gap_second(book: Workbook) -> None:
    texts = [str(row[0].value) for row in book["Summary"].iter_rows(max_col=1) if row[0].value]
    interval = next(k for k, text in enumerate(texts) if "80 % interval" in text)
    gap = next(k for k, text in enumerate(texts) if "gap 0.10 %" in text)
    assert interval < gap
    assert "+33.5 a week" in texts[interval]
    assert any("proven bound for any plan within the limits: 418.0" in text for text in texts)
    assert any("supply contracts" in text for text in texts)
    assert any(text == "Agreed with the buyer." for text in texts)
    assert len(book["Summary"]._images) == 1


def test_names_that_look_like_formulas_stay_text(book: Workbook) -> None:
    found = dict.fromkeys(records.TRICKY, 0)
    for _title, cell in cells(book):
        if cell.value in found:
            found[str(cell.value)] += 1
            assert cell.data_type == "s"
            assert cell.quotePrefix
    assert all(n >= 3 for n in found.values())


def test_no_formula_comes_from_data(book: Workbook) -> None:
    formulas = {(title, str(cell.value)) for title, cell in cells(book) if cell.data_type == "f"}
    assert len(formulas) == 5
    pattern = re.compile(r"=SUBTOTAL\(109,([A-Z]+)(\d+):\1(\d+)\)")
    for title, formula in formulas:
        assert title == "Item list"
        found = pattern.fullmatch(formula)
        assert found
        # The sum covers exactly the rows of the table.
        sheet = book["Item list"]
        header = header_row(sheet, "Cluster")
        assert (int(found[2]), int(found[3])) == (header + 1, header + 20)


def test_no_xml_formula_but_ours(path: Path) -> None:
    with zipfile.ZipFile(path) as archive:
        sheets = [n for n in archive.namelist() if n.startswith("xl/worksheets/sheet")]
        found = [f for n in sheets for f in re.findall(r"<f[ >].*?</f>", archive.read(n).decode("utf-8"))]
    assert len(found) == 5
    assert all("SUBTOTAL" in f for f in found)


def test_codes_keep_their_zeros_and_numbers_their_formats(book: Workbook) -> None:
    sheet = book["Item list"]
    header = header_row(sheet, "Cluster")
    titles = {str(sheet.cell(header, c).value): c for c in range(1, sheet.max_column + 1)}
    assert sheet.cell(header + 1, titles["Item"]).value == "0301"
    assert sheet.cell(header + 1, titles["Item"]).number_format == "@"
    assert sheet.cell(header + 1, titles["Price"]).number_format == "#,##0.00"
    assert sheet.cell(header + 1, titles["Stores today"]).number_format == "0%"
    assert (
        sheet.cell(header + 1, titles["Change in units"]).number_format
        == "[>=0.05]+#,##0.0;[<=-0.05]-#,##0.0;#,##0.0"
    )


def test_lists_can_be_filtered_and_printed(book: Workbook) -> None:
    for name in ("Item list", "Where sales go", "Single delistings", "Limits"):
        sheet = book[name]
        assert sheet.auto_filter.ref
        assert sheet.freeze_panes
        assert sheet.print_title_rows
    for sheet in book.worksheets:
        assert sheet.page_setup.fitToWidth == 1
        assert sheet.sheet_properties.pageSetUpPr.fitToPage
        assert all(d.width and d.width <= 92.0 for d in sheet.column_dimensions.values())
    assert book["Item list"].page_setup.orientation == "landscape"
    # A page of its own for every cluster.
    assert len(book["Item list"].row_breaks.brk) == 2


def test_chart_puts_the_largest_on_top(path: Path) -> None:
    with zipfile.ZipFile(path) as archive:
        chart = archive.read("xl/charts/chart1.xml").decode("utf-8")
    assert re.search(r"<(c:)?orientation val=\"maxMin\"", chart)
    assert chart.count("errBars>") == 4
    assert "'Where sales go'!" in chart
    assert "0072B2" in chart
    assert "D55E00" in chart


def test_every_column_is_explained(book: Workbook) -> None:
    sheet = book["What the figures mean"]
    header = header_row(sheet, "Sheet")
    rows = [[cell.value for cell in row[:3]] for row in sheet.iter_rows(min_row=header + 1)]
    explained = {(row[0], row[1]) for row in rows if row[2]}
    for name, first in (
        ("Item list", "Cluster"),
        ("Where sales go", "Kind"),
        ("Single delistings", "Segment"),
        ("Limits", "Limit"),
    ):
        shown = book[name]
        titles = [c.value for c in shown[header_row(shown, first)] if c.value]
        missing = [t for t in titles if (name, str(t).split(" (")[0]) not in explained]
        assert missing == []
    with pytest.raises(KeyError):
        meaning("tally", "no such column")


def secret_review() -> LoadedData:
    """Costs and margins that no other figure equals."""
    data = records.loaded()
    cost = np.array([1.117, 1.923, 0.917, 1.313, 1.217, 0.817, 1.019, 1.417])
    return replace(data, base=replace(data.base, cost=cost, margin=data.base.net_price - cost))


def test_without_costs_no_cost_or_margin_is_told(tmp_path: Path) -> None:
    data, fitted, plan = secret_review(), records.fitted(), records.plan()
    path = tmp_path / "open.xlsx"
    write_workbook(path, data, fitted, plan, with_costs=False)
    book = load_workbook(path)
    assert book.sheetnames == [name for name in SHEETS if name != "Ladder"]
    value = tally(fitted, data.base, plan.states)
    transfers = delistings(fitted, data.base)
    assert plan.outcome is not None
    secrets = [
        *data.base.cost, *data.base.margin.ravel(), *(value.effects.after * data.base.margin).ravel(),
        value.margin.today, value.margin.plan, value.margin.change, value.margin.low, value.margin.high,
        *(-transfers.margin_change), *(-transfers.margin_low), *(-transfers.margin_high),
        plan.outcome.value, plan.outcome.bound, plan.outcome.today_value, 2.5, 1.25,
    ]  # fmt: skip
    numbers = np.array([s for s in secrets if np.isfinite(s) and abs(s) > 1e-9])
    words = {
        f"{abs(s):,.{d}f}"
        for s in (value.margin.plan, value.margin.today, plan.outcome.value, plan.outcome.bound)
        for d in (0, 1, 2)
    }
    for title, cell in cells(book):
        if isinstance(cell.value, int | float):
            assert np.abs(numbers - cell.value).min() > 1e-6, (title, cell.coordinate, cell.value)
        else:
            text = str(cell.value)
            assert not any(word in text.split() for word in words), (title, cell.coordinate, text)
            assert "cost is above" not in text
    titles = {str(cell.value) for _title, cell in cells(book)}
    assert not {"Margin a week, plan", "Margin per unit", "Category margin a week"} & titles


def test_with_costs_the_same_search_finds_them(tmp_path: Path) -> None:
    """The search above would notice: with costs the margins are there."""
    data = secret_review()
    path = tmp_path / "all.xlsx"
    write_workbook(path, data, records.fitted(), records.plan())
    numbers = [cell.value for _t, cell in cells(load_workbook(path)) if isinstance(cell.value, float)]
    margin = tally(records.fitted(), data.base, records.planned()).margin.plan
    assert np.abs(np.array(numbers) - margin).min() < 1e-9


def test_without_any_cost_loaded(tmp_path: Path) -> None:
    path = tmp_path / "nothing.xlsx"
    write_workbook(path, records.without_costs(records.loaded()), records.fitted(), records.plan())
    texts = [str(cell.value) for _title, cell in cells(load_workbook(path))]
    assert any("add costs" in text for text in texts)
    assert any(text.startswith("Estimated change of sales") for text in texts)
    assert "Margin a week, plan" not in texts


def test_a_plan_made_by_hand_and_one_that_changes_nothing(tmp_path: Path) -> None:
    plan = replace(
        records.plan(), outcome=None, rungs=(), states=records.now(), limits=Limits("units"), reasons=()
    )
    path = tmp_path / "hand.xlsx"
    write_workbook(path, records.loaded(), records.fitted(), plan)
    texts = [str(cell.value) for _title, cell in cells(load_workbook(path))]
    assert any("made by hand" in text for text in texts)
    assert any("Nothing changes" in text for text in texts)
    assert "Ladder" not in load_workbook(path).sheetnames


def test_odd_names_and_long_notes_fit(tmp_path: Path) -> None:
    data = records.loaded()
    items = list(data.catalogue.items)
    items[0] = replace(items[0], description="bell\x07 and \x00 nul", brand="$x^2$", supplier="é" * 40_000)
    data = replace(data, catalogue=replace(data.catalogue, category="[Tea]: all/any?", items=tuple(items)))
    path = tmp_path / "odd.xlsx"
    write_workbook(
        path, data, records.fitted(), replace(records.plan(), name="=cmd|' /C calc'!A0", created="some day")
    )
    texts = [str(cell.value) for _title, cell in cells(load_workbook(path))]
    assert any(text.startswith("bell\N{REPLACEMENT CHARACTER}") for text in texts)
    assert max(map(len, texts)) == 32_767


def test_the_same_plan_gives_the_same_workbook(path: Path, tmp_path: Path) -> None:
    again = tmp_path / "again.xlsx"
    write_workbook(again, records.loaded(), records.fitted(), records.plan())
    with zipfile.ZipFile(path) as one, zipfile.ZipFile(again) as other:
        assert one.namelist() == other.namelist()
        for name in one.namelist():
            if name != "docProps/core.xml":
                assert one.read(name) == other.read(name), name
    created = load_workbook(again).properties.created
    assert created == datetime(2026, 3, 20, 10, 30)


def test_bad_targets(tmp_path: Path) -> None:
    data, fitted, plan = records.loaded(), records.fitted(), records.plan()
    with pytest.raises(CallError, match=r"ends in '\.xls'"):
        write_workbook(tmp_path / "plan.xls", data, fitted, plan)
    with pytest.raises(CallError, match="no folder"):
        write_workbook(tmp_path / "none" / "plan.xlsx", data, fitted, plan)
    locked = tmp_path / "locked.xlsx"
    locked.write_bytes(b"mine")
    locked.chmod(0o444)
    with pytest.raises(CallError, match="read-only") as caught:
        write_workbook(locked, data, fitted, plan)
    assert caught.value.remedy
    assert locked.read_bytes() == b"mine"
    assert [p.name for p in tmp_path.iterdir()] == ["locked.xlsx"]


@pytest.mark.slow
def test_a_spreadsheet_program_reads_and_sums(path: Path, tmp_path: Path) -> None:
    office = shutil.which("soffice")
    assert office, "the slow tier needs a spreadsheet program (Debian: libreoffice-calc)"
    command = [office, f"-env:UserInstallation={(tmp_path / 'home').as_uri()}", "--headless"]
    command += ["--convert-to", "xlsx:Calc MS Excel 2007 XML", "--outdir", str(tmp_path), str(path)]
    subprocess.run(command, check=True, capture_output=True, timeout=120)
    sheet = load_workbook(tmp_path / path.name, data_only=True)["Item list"]
    header = header_row(sheet, "Cluster")
    titles = {str(sheet.cell(header, c).value): c for c in range(1, sheet.max_column + 1)}
    for title in ("Units a week, plan", "Margin a week, plan", "Sales a week, plan"):
        column = titles[title]
        rows = [sheet.cell(row, column).value for row in range(header + 1, header + 21)]
        assert sheet.cell(header - 1, column).value == pytest.approx(sum(rows), rel=1e-9)
