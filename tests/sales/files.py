"""A small invented chain as plain rows, and files written from it in every format."""

from __future__ import annotations

import csv
import gzip
from datetime import date, timedelta
from pathlib import Path

import openpyxl
import pandas as pd

from planner.sales.load import load, request_from_folder
from planner.sales.report import LoadedData

Row = dict[str, object]
START = date(2024, 1, 1)
STORES = ("S01", "S02", "S03")
ITEMS = ("0010", "0011", "0012", "0013")
SEGMENTS = {"0010": "mint", "0011": "mint", "0012": "camomile", "0013": "camomile"}
PRICES = {"0010": 2.5, "0011": 3.0, "0012": 2.0, "0013": 4.0}


def monday(week: int) -> date:
    """Monday of the week, counted from the chain's first."""
    return START + timedelta(weeks=week)


def sales_rows(weeks: int = 20, units: int = 10) -> list[Row]:
    """One row per store, week and item, all sold alike."""
    return [
        {
            "store_no": store,
            "week_commencing": monday(w).isoformat(),
            "sku": item,
            "qty": units,
            "sales_value": f"{units * PRICES[item]:.2f}",
        }
        for store in STORES
        for w in range(weeks)
        for item in ITEMS
    ]


def item_rows() -> list[Row]:
    """Items with segment and brand."""
    return [
        {"sku": item, "description": f"Tea {item}", "segment": SEGMENTS[item], "brand": "Oakleaf"}
        for item in ITEMS
    ]


def write_csv(path: Path, rows: list[Row], delimiter: str = ",", encoding: str = "utf-8") -> None:
    """A delimited file; .gz is compressed."""
    headers = list(dict.fromkeys(key for row in rows for key in row))
    lines = [headers, *[[row.get(h, "") for h in headers] for row in rows]]
    if path.name.endswith(".gz"):
        with gzip.open(path, "wt", encoding=encoding, newline="") as file:
            csv.writer(file, delimiter=delimiter).writerows(lines)
    else:
        with path.open("w", encoding=encoding, newline="") as file:
            csv.writer(file, delimiter=delimiter).writerows(lines)


def write_xlsx(path: Path, rows: list[list[object]], sheet: str = "Sheet1") -> None:
    """A workbook with one sheet of raw cell values."""
    book = openpyxl.Workbook()
    page = book.active
    assert page is not None
    page.title = sheet
    for row in rows:
        page.append(row)
    book.save(path)


def write_parquet(path: Path, rows: list[Row]) -> None:
    """A Parquet file with the rows' own types."""
    pd.DataFrame(rows).to_parquet(path, index=False)


def load_rows(
    folder: Path, sales: list[Row] | None = None, items: list[Row] | None = None, **more: object
) -> LoadedData:
    """Write the tables as CSV and load the folder; ``more``: further tables (lists of rows) or choices."""
    write_csv(folder / "sales.csv", sales_rows() if sales is None else sales)
    write_csv(folder / "items.csv", item_rows() if items is None else items)
    choices: dict[str, object] = {}
    for name, value in more.items():
        if isinstance(value, list):
            write_csv(folder / f"{name}.csv", value)
        else:
            choices[name] = value
    return load(request_from_folder(folder, **choices))


def reconciles(loaded: LoadedData) -> bool:
    """Money and rows in = used + set aside, exactly."""
    report = loaded.report
    aside = [check for check in report.checks if check.set_aside]
    money = report.money_used + sum(check.money for check in aside)
    rows = report.rows_used + sum(check.rows for check in aside)
    return money == report.money_read and rows == report.rows_read == report.rows_used + len(loaded.set_aside)


def check(loaded: LoadedData, code: str) -> tuple[int, str, bool]:
    """(rows, money, set aside) of a check; zeros when it found nothing."""
    for found in loaded.report.checks:
        if found.code == code:
            return found.rows, str(found.money), found.set_aside
    return 0, "0", False
