"""Numbers as text, and CSV files."""

from __future__ import annotations

import csv
import math
import os
from datetime import date
from decimal import Decimal
from pathlib import Path

import pytest

from planner.base.errors import CallError
from planner.tables.csv import write_csv
from planner.tables.format import number, percent, sensible_decimals, span, table_text, value_text
from planner.tables.table import Column, Table


def test_numbers_have_signs_only_when_they_mean_something() -> None:
    assert number(1234567.891, 2) == "1,234,567.89"
    assert number(-0.004, 2) == "0.00"
    assert number(-3.2, 1) == "-3.2"
    assert number(3.2, 1, signed=True) == "+3.2"
    assert number(0.0, 0, signed=True) == "0"
    assert number(math.nan) == number(math.inf) == ""


def test_percent_span_and_decimals() -> None:
    assert percent(0.1234, 1) == "12.3 %"
    assert span(-2.0, 3.0, 1, signed=True) == "-2.0 to +3.0"
    assert span(math.nan, 3.0) == ""
    assert [sensible_decimals([x]) for x in (0.5, 12.0, 1234.0, 0.0, math.nan)] == [2, 1, 0, 0, 0]


@pytest.mark.parametrize(
    ("value", "kind", "expected"),
    [
        (None, "money", ""),
        (True, "flag", "yes"),
        (False, "flag", "no"),
        (None, "flag", ""),
        (date(2026, 3, 2), "text", "2026-03-02"),
        ("=1+1", "text", "=1+1"),
        (Decimal("1234.50"), "money", "1,234.50"),
        (12.0, "count", "12"),
        (0.25, "percent", "25.00 %"),
    ],
)
def test_every_kind_has_one_format(value: object, kind: str, expected: str) -> None:
    assert value_text(value, kind, 2) == expected


def sample() -> Table:
    return Table(
        "sample",
        "Sample",
        (
            Column("item", "Item", "text", ("0101", '=1+1, "x"', "")),
            Column("from", "From", "text", (date(2026, 1, 5), None, "")),
            Column("share", "Share", "percent", (0.1, math.nan, 1 / 3)),
            Column("money", "Money", "money", (Decimal("0.10"), Decimal("1E+3"), None), decimals=2),
            Column("own", "Own", "flag", (True, False, None)),
        ),
    )


def test_text_for_a_terminal_lines_up_and_says_what_is_cut() -> None:
    lines = table_text(sample(), ("item", "money"), rows=2).splitlines()
    assert lines == [
        "Item          Money",
        "0101           0.10",
        '=1+1, "x"  1,000.00',
        "... and 1 more rows",
    ]


def test_csv_has_exact_numbers_and_untouched_text(tmp_path: Path) -> None:
    path = tmp_path / "sample.csv"
    path.write_text("old", encoding="utf-8")
    write_csv(sample(), path)
    text = path.read_bytes().decode("utf-8")
    assert text.splitlines() == [
        "item,from,share,money,own",
        "0101,2026-01-05,0.1,0.10,yes",
        '"=1+1, ""x""",,,1000,no',
        f",,{1 / 3!r},,",
    ]
    assert "\r" not in text
    with path.open(encoding="utf-8", newline="") as file:
        assert float(list(csv.DictReader(file))[2]["share"]) == 1 / 3
    assert [p.name for p in tmp_path.iterdir()] == ["sample.csv"]


def test_bad_targets_are_named_with_a_remedy(tmp_path: Path) -> None:
    locked = tmp_path / "locked.csv"
    locked.write_text("keep me", encoding="utf-8")
    locked.chmod(0o444)
    folder = tmp_path / "folder.csv"
    folder.mkdir()
    wrong = {
        "missing folder": tmp_path / "nowhere" / "a.csv",
        "folder": folder,
        "read-only": locked,
        "ending": tmp_path / "a.xlsx",
    }
    for path in wrong.values():
        with pytest.raises(CallError) as caught:
            write_csv(sample(), path)
        assert str(path) in caught.value.place
        assert caught.value.remedy
    assert locked.read_text(encoding="utf-8") == "keep me"


def test_nothing_but_an_ordinary_file_is_replaced(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe.csv"
    os.mkfifo(pipe)
    with pytest.raises(CallError, match="ordinary file"):
        write_csv(sample(), pipe)
    assert pipe.is_fifo()


def test_a_failure_while_writing_leaves_the_old_file(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("old", encoding="utf-8")

    class Broken:
        def __str__(self) -> str:
            raise ValueError("cannot be shown")

    table = Table("t", "T", (Column("a", "A", "text", ("fine", Broken())),))
    with pytest.raises(ValueError, match="cannot be shown"):
        write_csv(table, path)
    assert path.read_text(encoding="utf-8") == "old"
    assert [p.name for p in tmp_path.iterdir()] == ["a.csv"]
