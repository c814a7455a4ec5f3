"""Dates and week codes."""

from __future__ import annotations

from datetime import date, timedelta
from pathlib import Path

import pytest

from planner.base.errors import DataError
from planner.sales.weeks import Calendar, _read, monday_of, week_code
from tests.sales.files import STORES, check, load_rows, monday, reconciles, sales_rows


def _rows(texts: list[str], header: str = "week") -> list[dict[str, object]]:
    return [
        {"store": store, header: text, "sku": item, "units": 5, "revenue": "10.00"}
        for store in STORES
        for text in texts
        for item in ("0010", "0011", "0012", "0013")
    ]


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("2024-03-05", date(2024, 3, 5)), ("2024/3/5", date(2024, 3, 5)), ("20240305", date(2024, 3, 5)),
        ("05.03.2024", date(2024, 3, 5)), ("05/03/2024", date(2024, 3, 5)), ("5-3-24", date(2024, 3, 5)),
        ("5 Mar 2024", date(2024, 3, 5)), ("05-MAR-24", date(2024, 3, 5)),
        ("March 5, 2024", date(2024, 3, 5)),
        ("45356", date(2024, 3, 5)), ("2024-W10-2", date(2024, 3, 5)),
        ("2024-W10", date(2024, 3, 4)), ("2024W10", date(2024, 3, 4)), ("202410", date(2024, 3, 4)),
        ("W10 2024", date(2024, 3, 4)), ("10/2024", date(2024, 3, 4)), ("2024-10", date(2024, 3, 4)),
    ],
)  # fmt: skip
def test_writings(text: str, expected: date) -> None:
    kind, ordinal = _read(text, Calendar("dmy"))
    assert ordinal == expected.toordinal()
    assert kind == ("day" if expected.day == 5 else "week")


@pytest.mark.parametrize("text", ["2024-02-30", "2024-13-01", "1900-01-01", "31/02/2024", "soon", "2023-W53"])
def test_no_dates(text: str) -> None:
    assert _read(text, Calendar("dmy"))[1] is None


# ISO 8601 weeks, published values: Python's datetime and the isoweek package agree on them.
@pytest.mark.parametrize(
    ("day", "year", "week", "weekday"),
    [
        (date(2005, 1, 1), 2004, 53, 6), (date(2007, 12, 31), 2008, 1, 1), (date(2008, 12, 29), 2009, 1, 1),
        (date(2009, 12, 31), 2009, 53, 4), (date(2010, 1, 3), 2009, 53, 7), (date(2021, 1, 3), 2020, 53, 7),
        (date(2024, 12, 30), 2025, 1, 1), (date(2027, 1, 1), 2026, 53, 5),
    ],
)  # fmt: skip
def test_iso_weeks(day: date, year: int, week: int, weekday: int) -> None:
    start = day - timedelta(days=weekday - 1)
    assert Calendar().monday(year, week) == start.toordinal()
    assert monday_of((day.toordinal() - 1) // 7) == start
    assert _read(f"{year}-W{week:02d}", Calendar()) == ("week", start.toordinal())


def test_years_of_53_iso_weeks() -> None:
    long_years = [year for year in range(2000, 2036) if Calendar().monday(year, 53) is not None]
    assert long_years == [2004, 2009, 2015, 2020, 2026, 2032]
    assert sum(Calendar().monday(year, 53) is not None for year in range(2000, 2400)) == 71


def test_week_codes() -> None:
    assert week_code("202453") == (2024, 53)
    assert week_code("2024-W05") == (2024, 5)
    assert week_code("mint") is None


@pytest.mark.parametrize("pattern", ["%d/%m/%Y", "%m/%d/%Y", "%d.%m.%Y", "%Y%m%d", "%d %b %Y"])
def test_date_order_is_found(tmp_path: Path, pattern: str) -> None:
    loaded = load_rows(tmp_path, _rows([monday(w).strftime(pattern) for w in range(8)]))
    assert loaded.panel.weeks == tuple(monday(w) for w in range(8))


def test_unclear_date_order_is_asked(tmp_path: Path) -> None:
    texts = ["05/02/2024", "04/03/2024", "01/04/2024"]
    with pytest.raises(DataError, match=r"sales\.csv, column 'week'.*date_order=dmy"):
        load_rows(tmp_path, _rows(texts))
    loaded = load_rows(tmp_path, _rows(texts), matches=(("sales", "date_order", "dmy"),))
    assert loaded.panel.weeks[0] == date(2024, 2, 5)
    loaded = load_rows(tmp_path, _rows(texts), matches=(("sales", "date_order", "mdy"),))
    assert loaded.panel.weeks[0] == date(2024, 1, 1)


@pytest.mark.parametrize("pattern", ["{y}-W{w:02d}", "{y}{w:02d}"])
def test_week_codes_over_new_year(tmp_path: Path, pattern: str) -> None:
    texts = [pattern.format(y=2020, w=w) for w in range(50, 54)] + [pattern.format(y=2021, w=1)]
    loaded = load_rows(tmp_path, _rows(texts))
    assert loaded.panel.weeks[-2:] == (date(2020, 12, 28), date(2021, 1, 4))
    assert len(loaded.panel.weeks) == 5


def test_year_and_week_columns(tmp_path: Path) -> None:
    rows = [{**row, "year": 2024, "week": int(str(row["week"]))} for row in _rows(["5", "6", "7"])]
    assert load_rows(tmp_path, rows).panel.weeks[0] == date(2024, 1, 29)


def test_fiscal_weeks_are_asked_and_read(tmp_path: Path) -> None:
    texts = [f"2024{w:02d}" for w in range(50, 54)] + ["202501", "202502"]
    with pytest.raises(DataError, match=r"week 53 of 2024.*--match sales\.first_monday"):
        load_rows(tmp_path, _rows(texts))
    shoppers = [
        {"store": store, "week": text, "shoppers": 100 + k}
        for store in STORES
        for k, text in enumerate(texts)
    ]
    loaded = load_rows(
        tmp_path, _rows(texts), shoppers=shoppers, matches=(("sales", "first_monday", "2025-01-06"),)
    )
    assert loaded.panel.weeks == tuple(date(2025, 1, 6) + timedelta(weeks=k) for k in range(6))
    assert loaded.panel.shoppers is not None
    assert loaded.panel.shoppers[:6].tolist() == [100, 101, 102, 103, 104, 105]
    with pytest.raises(DataError, match="does not say which Monday"):
        load_rows(tmp_path, _rows(texts), matches=(("sales", "first_monday", "2025-01-07"),))


def test_days_become_weeks_and_part_weeks_are_flagged(tmp_path: Path) -> None:
    days = [(date(2024, 1, 3) + timedelta(days=k)).isoformat() for k in range(5 + 14 + 4)]
    loaded = load_rows(tmp_path, _rows(days, "date"))
    panel = loaded.panel
    assert panel.weeks == tuple(monday(w) for w in range(4))
    assert panel.units[0].tolist() == [25.0] * 4
    assert panel.units[1].tolist() == [35.0] * 4
    assert panel.on_sale[0, 0] == pytest.approx(5 / 7)
    assert panel.on_sale[1, 0] == 1.0
    assert panel.on_sale[3, 0] == pytest.approx(4 / 7)
    assert check(loaded, "part_week")[0] == (5 + 4) * 12
    assert loaded.base.units[0, 0] == pytest.approx(35.0)
    assert reconciles(loaded)


@pytest.mark.parametrize(
    ("header", "shift"), [("week_ending", 6), ("week_commencing", -1), ("week_commencing", 0)]
)
def test_weeks_that_start_or_end_on_another_day(tmp_path: Path, header: str, shift: int) -> None:
    texts = [(monday(w) + timedelta(days=shift)).isoformat() for w in range(6)]
    loaded = load_rows(tmp_path, _rows(texts, header))
    assert loaded.panel.weeks == tuple(monday(w) for w in range(6))
    assert check(loaded, "part_week")[0] == 0


def test_unreadable_and_stray_weeks_are_set_aside(tmp_path: Path) -> None:
    rows = sales_rows(20)
    rows[0]["week_commencing"] = "sometime"
    rows[1]["week_commencing"] = "1999-01-04"
    rows[2]["week_commencing"] = ""
    rows[3]["week_commencing"] = "2024-02-30"
    loaded = load_rows(tmp_path, rows)
    assert check(loaded, "unreadable_week") == (3, "85.00", True)
    assert check(loaded, "stray_week") == (1, "30.00", True)
    assert len(loaded.panel.weeks) == 20
    assert reconciles(loaded)
