"""Every file format gives the same data."""

from __future__ import annotations

from datetime import date, datetime
from decimal import Decimal
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from planner.base.errors import CallError, DataError
from planner.sales.load import load, request_from_folder
from planner.sales.reading import read_table
from planner.sales.request import LoadRequest
from tests.sales.files import ITEMS, Row, item_rows, monday, sales_rows, write_csv, write_parquet, write_xlsx

WEEKS = 6


def _loaded(folder: Path, sales: Path, **choices: object):
    write_csv(folder / "items.csv", item_rows())
    return load(LoadRequest(sales, folder / "items.csv", **choices))  # type: ignore[arg-type]


def _assert_whole(loaded) -> None:
    assert [item.code for item in loaded.catalogue.items] == list(ITEMS)
    assert [store.code for store in loaded.catalogue.stores] == ["S01", "S02", "S03"]
    assert loaded.panel.weeks[0] == date(2024, 1, 1)
    assert loaded.panel.units.shape == (3 * WEEKS, 4)
    assert (loaded.panel.units == 10.0).all()
    assert loaded.report.money_read == Decimal("10") * Decimal("11.5") * 3 * WEEKS
    assert loaded.report.money_used == loaded.report.money_read
    np.testing.assert_allclose(loaded.base.price, [[2.5, 3.0, 2.0, 4.0]])


@pytest.mark.parametrize("delimiter", [",", ";", "\t", "|"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "cp1252"])
def test_delimiters_and_encodings(tmp_path: Path, delimiter: str, encoding: str) -> None:
    rows = [{**row, "note": "crème brûlée"} for row in sales_rows(WEEKS)]
    write_csv(tmp_path / "sales.csv", rows, delimiter, encoding)
    table = read_table(tmp_path / "sales.csv", "sales")
    assert table.columns["note"].texts() == ["crème brûlée"]
    _assert_whole(_loaded(tmp_path, tmp_path / "sales.csv"))


@pytest.mark.parametrize("encoding", ["utf-16-le", "utf-16-be"])
def test_utf16_without_mark(tmp_path: Path, encoding: str) -> None:
    write_csv(tmp_path / "sales.csv", sales_rows(WEEKS), ";", encoding)
    _assert_whole(_loaded(tmp_path, tmp_path / "sales.csv"))


@pytest.mark.parametrize("name", ["sales.tsv", "sales.txt", "sales.csv.gz"])
def test_text_endings(tmp_path: Path, name: str) -> None:
    write_csv(tmp_path / name, sales_rows(WEEKS), "\t")
    _assert_whole(_loaded(tmp_path, tmp_path / name))


def test_decimal_comma_and_thousands(tmp_path: Path) -> None:
    rows = sales_rows(WEEKS)
    for row in rows:
        row["sales_value"] = str(row["sales_value"]).replace(".", ",")
    rows[0]["qty"], rows[0]["sales_value"] = "1.000", "2.500,00"
    write_csv(tmp_path / "sales.csv", rows, ";")
    loaded = _loaded(tmp_path, tmp_path / "sales.csv")
    assert loaded.panel.units[0, 0] == 1000.0
    assert loaded.report.money_read == Decimal("115") * 3 * WEEKS + Decimal("2475.00")


def test_quoted_thousands_with_decimal_point(tmp_path: Path) -> None:
    rows = sales_rows(WEEKS)
    rows[0]["qty"], rows[0]["sales_value"] = "1,000", "€ 2,500.00"
    write_csv(tmp_path / "sales.csv", rows)
    loaded = _loaded(tmp_path, tmp_path / "sales.csv")
    assert loaded.panel.units[0, 0] == 1000.0
    assert loaded.report.checks == ()


def test_unclear_decimal_mark_is_asked(tmp_path: Path) -> None:
    rows = [{**row, "sales_value": "2,500"} for row in sales_rows(WEEKS)]
    write_csv(tmp_path / "sales.csv", rows, ";")
    with pytest.raises(DataError, match=r"sales\.csv.*sales_value.*2,500.*--match sales\.decimal_mark"):
        _loaded(tmp_path, tmp_path / "sales.csv")
    said = _loaded(tmp_path, tmp_path / "sales.csv", matches=(("sales", "decimal_mark", ","),))
    assert said.report.money_read == Decimal("2.5") * len(rows)
    said = _loaded(tmp_path, tmp_path / "sales.csv", matches=(("sales", "decimal_mark", "."),))
    assert said.report.money_read == Decimal(2500) * len(rows)


def _typed(rows: list[Row]) -> list[Row]:
    return [
        {
            **row,
            "week_commencing": datetime.fromisoformat(str(row["week_commencing"])),
            "sales_value": float(str(row["sales_value"])),
        }
        for row in rows
    ]


def test_xlsx(tmp_path: Path) -> None:
    rows = _typed(sales_rows(WEEKS))
    write_xlsx(tmp_path / "sales.xlsx", [list(rows[0]), *[list(row.values()) for row in rows]])
    _assert_whole(_loaded(tmp_path, tmp_path / "sales.xlsx"))


def test_xlsx_numbers_as_codes_and_blank_rows(tmp_path: Path) -> None:
    rows = _typed(sales_rows(WEEKS))
    for row in rows:
        row["sku"] = int(str(row["sku"]))
    lines: list[list[object]] = [[], list(rows[0]), []]
    write_xlsx(tmp_path / "sales.xlsx", [*lines, *[list(row.values()) for row in rows]], "Sales")
    loaded = _loaded(tmp_path, tmp_path / "sales.xlsx")
    _assert_whole(loaded)
    found = {c.code: c for c in loaded.report.checks}
    assert found["similar_code"].rows == len(rows)
    assert found["similar_code"].examples[0][1] == 4


def test_parquet_file_and_folder(tmp_path: Path) -> None:
    rows = _typed(sales_rows(WEEKS))
    write_parquet(tmp_path / "sales.parquet", rows)
    _assert_whole(_loaded(tmp_path, tmp_path / "sales.parquet"))
    (tmp_path / "parts").mkdir()
    write_parquet(tmp_path / "parts" / "a.parquet", rows[:30])
    write_parquet(tmp_path / "parts" / "b.parquet", rows[30:])
    _assert_whole(_loaded(tmp_path, tmp_path / "parts"))


def test_parquet_dates_and_decimals(tmp_path: Path) -> None:
    frame = pd.DataFrame(_typed(sales_rows(WEEKS)))
    frame["week_commencing"] = frame["week_commencing"].dt.date
    frame["sales_value"] = [Decimal(f"{value:.2f}") for value in frame["sales_value"]]
    frame.to_parquet(tmp_path / "sales.parquet")
    _assert_whole(_loaded(tmp_path, tmp_path / "sales.parquet"))


def test_blank_lines_quotes_and_row_numbers(tmp_path: Path) -> None:
    head = "store,week,item,units,revenue,remark\n"
    body = (
        'S01,2024-01-01,0010,2,5.00,"two\nlines"\n'
        "\n"
        "S01,2024-01-08,0010,2,5.00,plain\n"
        "S01,2024-01-15,0010,x,5.00,bad\n"
    )
    (tmp_path / "sales.csv").write_text(head + body, encoding="utf-8")
    loaded = _loaded(tmp_path, tmp_path / "sales.csv")
    assert loaded.report.rows_read == 3
    assert loaded.set_aside[["file", "row", "units"]].to_numpy().tolist() == [["sales.csv", 6, "x"]]


def test_rows_of_another_width(tmp_path: Path) -> None:
    text = (
        "store,week,item,units,revenue\n"
        "S01,2024-01-01,0010,2,5.00\n"
        "S01,2024-01-08,0010,2\n"
        "S01,2024-01-15,0010,2,5,00\n"
        "S01,2024-01-22,0010,2,5.00,\n"
    )
    (tmp_path / "sales.csv").write_text(text, encoding="utf-8")
    loaded = _loaded(tmp_path, tmp_path / "sales.csv")
    assert loaded.set_aside["row"].tolist() == [3, 4]
    assert loaded.report.rows_used == 2


@pytest.mark.parametrize(
    ("name", "content", "words"),
    [
        ("sales.csv", b"", "empty"),
        ("sales.csv", b"store,week,item,units,revenue\n", "header but no rows"),
        ("sales.csv", b"\x7fELF\x02\x01\x00\x00\x01\x00\x10\x00" * 50, "binary"),
        ("sales.csv.gz", b"\x1f\x8b\x08\x00\x00\x00\x00\x00\x00\x03\xcb", "damaged"),
        ("sales.xlsx", b"not a workbook", "workbook"),
        ("sales.parquet", b"not parquet", "Parquet"),
        ("sales.docx", b"x", "not read"),
        ("sales.csv", b"a,a\n1,2\n", "called 'a'"),
    ],
)
def test_unusable_files_are_named(tmp_path: Path, name: str, content: bytes, words: str) -> None:
    (tmp_path / name).write_bytes(content)
    with pytest.raises(DataError, match=words) as caught:
        _loaded(tmp_path, tmp_path / name)
    assert name in caught.value.place
    assert caught.value.remedy


def test_damaged_workbooks_are_named(tmp_path: Path) -> None:
    rows = _typed(sales_rows(WEEKS))
    path = tmp_path / "sales.xlsx"
    write_xlsx(path, [list(rows[0]), *[list(row.values()) for row in rows]])
    whole = path.read_bytes()
    said: list[str] = []
    for k in range(40):
        path.write_bytes(whole[: len(whole) * k // 40] if k % 2 else _spoilt(whole, k))
        try:
            _assert_whole(_loaded(tmp_path, path))
        except DataError as error:
            said.append(str(error))
    assert len(said) > 20
    assert all("sales.xlsx" in words for words in said)


def _spoilt(data: bytes, seed: int) -> bytes:
    rng = np.random.default_rng(seed)
    cells = np.frombuffer(data, dtype=np.uint8).copy()
    cells[rng.integers(0, cells.size, 30)] ^= 0x5A
    return cells.tobytes()


def test_missing_files(tmp_path: Path) -> None:
    with pytest.raises(DataError, match="no such file"):
        _loaded(tmp_path, tmp_path / "sales.csv")
    with pytest.raises(DataError, match="no such folder"):
        request_from_folder(tmp_path / "nowhere")
    with pytest.raises(DataError, match="no file for sales"):
        request_from_folder(tmp_path)


def test_folder_finds_every_ending(tmp_path: Path) -> None:
    write_csv(tmp_path / "Sales.csv.gz", sales_rows(WEEKS))
    write_csv(tmp_path / "items.tsv", item_rows(), "\t")
    write_parquet(
        tmp_path / "stores.parquet", [{"store": s, "cluster": "all"} for s in ("S01", "S02", "S03")]
    )
    request = request_from_folder(tmp_path, baseline_weeks=4)
    assert (request.sales.name, request.baseline_weeks) == ("Sales.csv.gz", 4)
    _assert_whole(load(request))
    write_csv(tmp_path / "items.csv", item_rows())
    with pytest.raises(DataError, match="more than once"):
        request_from_folder(tmp_path)


def test_unknown_table_in_a_match(tmp_path: Path) -> None:
    write_csv(tmp_path / "sales.csv", sales_rows(2))
    with pytest.raises(CallError, match="not a table"):
        _loaded(tmp_path, tmp_path / "sales.csv", matches=(("sale", "units", "qty"),))


def test_week_of_the_helper() -> None:
    assert monday(1) == date(2024, 1, 8)
