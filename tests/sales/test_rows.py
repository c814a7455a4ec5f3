"""Defects of rows: each is counted, treated and reconciled to the penny."""

from __future__ import annotations

import random
from decimal import Decimal
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from planner.base.errors import DataError
from planner.sales.gtin import check_digit, is_valid
from planner.sales.load import load, request_from_folder
from tests.sales.files import Row, check, item_rows, load_rows, monday, reconciles, sales_rows, write_csv


def _row(store: str, week: int, item: str, units: object, money: object, **more: object) -> Row:
    return {
        "store_no": store,
        "week_commencing": monday(week).isoformat(),
        "sku": item,
        "qty": units,
        "sales_value": money,
        **more,
    }


def test_clean_file_has_no_findings(tmp_path: Path) -> None:
    loaded = load_rows(tmp_path)
    assert loaded.report.checks == ()
    assert loaded.report.money_read == Decimal("6900.00")
    assert reconciles(loaded)
    assert loaded.set_aside.empty
    assert list(loaded.set_aside.columns)[:3] == ["file", "row", "reason"]


def test_duplicates(tmp_path: Path) -> None:
    rows = sales_rows(20)
    rows += [dict(rows[0]), dict(rows[0]), _row("S01", 1, "0011", 4, "12.00")]
    loaded = load_rows(tmp_path, rows)
    assert check(loaded, "duplicate_row") == (2, "50.00", True)
    assert check(loaded, "conflicting_duplicate") == (2, "42.00", False)
    assert loaded.panel.units[0, 0] == 10.0
    assert loaded.panel.units[1, 1] == 14.0
    assert loaded.set_aside["row"].tolist() == [242, 243]
    assert reconciles(loaded)


def test_single_purchases_are_added_up_not_set_aside(tmp_path: Path) -> None:
    rows = [_row("S01", w, "0010", 1, "2.50") for w in range(20) for _purchase in range(60)]
    loaded = load_rows(tmp_path, rows)
    assert loaded.panel.units[:, 0].tolist() == [60.0] * 20
    assert check(loaded, "duplicate_row")[0] == 0
    assert check(loaded, "conflicting_duplicate") == (1200, "3000.00", False)


def test_returns(tmp_path: Path) -> None:
    rows = sales_rows(20)
    rows += [_row("S01", 3, "0010", -4, "-10.00"), _row("S02", 3, "0010", -11, "-27.50")]
    rows += [_row("S03", 3, "0010", -6, "-15.00"), _row("S03", 3, "0010", -5, "-12.50")]
    loaded = load_rows(tmp_path, rows)
    assert check(loaded, "return_netted") == (1, "-10.00", False)
    assert check(loaded, "return_set_aside") == (3, "-55.00", True)
    assert [loaded.panel.units[20 * s + 3, 0] for s in range(3)] == [6.0, 10.0, 10.0]
    assert loaded.panel.price[3, 0] == pytest.approx(2.5)
    assert reconciles(loaded)


def test_total_lines(tmp_path: Path) -> None:
    rows = sales_rows(4)
    rows.insert(12, _row("S01", 0, "Subtotal S01", 40, "115.00"))
    rows += [
        {"store_no": "Grand Total", "qty": 480, "sales_value": "1380.00"},
        {"store_no": "S02", "week_commencing": "TOTAL", "sku": "", "qty": 1, "sales_value": "1.00"},
    ]
    loaded = load_rows(tmp_path, rows)
    assert check(loaded, "total_line") == (3, "1496.00", True)
    assert loaded.set_aside["row"].tolist() == [14, 51, 52]
    assert reconciles(loaded)


def test_total_in_a_description_is_no_total(tmp_path: Path) -> None:
    rows = [{**row, "description": "Total Calm Tea"} for row in sales_rows(4)]
    assert check(load_rows(tmp_path, rows), "total_line")[0] == 0


def test_unknown_items_and_stores(tmp_path: Path) -> None:
    rows = [*sales_rows(4), _row("S01", 0, "0099", 2, "4.98"), _row("S99", 0, "0010", 1, "2.50")]
    rows += [_row("", 0, "0010", 1, "2.50"), _row("S01", 0, "", 1, "2.50")]
    stores = [{"store": s, "cluster": "all"} for s in ("S01", "S02", "S03")]
    loaded = load_rows(tmp_path, rows, stores=stores)
    assert check(loaded, "unknown_item") == (1, "4.98", True)
    assert check(loaded, "unknown_store") == (1, "2.50", True)
    assert check(loaded, "blank_code") == (2, "5.00", True)
    found = next(c for c in loaded.report.checks if c.code == "unknown_item")
    file, row, words = found.examples[0]
    assert (file, row) == ("sales.csv", 50)
    assert "sku=0099" in words
    assert reconciles(loaded)


def test_unreadable_and_missing_numbers(tmp_path: Path) -> None:
    rows = sales_rows(4)
    rows[0]["qty"] = "ten"
    rows[1]["sales_value"] = "n.n."
    rows[2]["qty"] = ""
    rows[3]["sales_value"] = "NULL"
    rows[4]["qty"] = "Infinity"
    loaded = load_rows(tmp_path, rows)
    assert check(loaded, "unreadable_number") == (3, "50.00", True)
    assert check(loaded, "blank_number") == (2, "20.00", True)
    assert loaded.report.money_read == Decimal("1310.00")
    assert reconciles(loaded)


def test_prices_that_cannot_be(tmp_path: Path) -> None:
    rows = sales_rows(20)
    rows[0]["sales_value"] = "0.00"
    rows[1]["qty"] = 0
    rows[2]["sales_value"] = "-20.00"
    rows[3]["sales_value"] = "4000.00"
    rows[4]["sales_value"] = "0.25"
    loaded = load_rows(tmp_path, rows)
    assert check(loaded, "zero_price") == (1, "0.00", True)
    assert check(loaded, "money_without_units") == (1, "30.00", True)
    assert check(loaded, "sign_mismatch") == (1, "-20.00", True)
    assert check(loaded, "absurd_price") == (2, "4000.25", True)
    assert reconciles(loaded)


def test_categories(tmp_path: Path) -> None:
    items = item_rows()
    for item in items[:2]:
        item["category"] = "Teas"
    for item in items[2:]:
        item["category"] = "Cakes"
    with pytest.raises(DataError, match=r"2 categories: Cakes, Teas.*--category"):
        load_rows(tmp_path, items=items)
    with pytest.raises(DataError, match=r"no sales of a category 'Pies'.*Cakes, Teas"):
        load_rows(tmp_path, items=items, category="Pies")
    loaded = load_rows(tmp_path, items=items, category="teas")
    assert loaded.catalogue.category == "Teas"
    assert [item.code for item in loaded.catalogue.items] == ["0010", "0011"]
    assert check(loaded, "other_category") == (120, "3600.00", True)
    assert reconciles(loaded)


def test_category_column_of_the_sales(tmp_path: Path) -> None:
    rows = [{**row, "category": "Teas"} for row in sales_rows(4)]
    rows.append(_row("S01", 0, "7777", 1, "1.00", category="Cakes"))
    rows.append(_row("S01", 0, "7778", 1, "1.50", category="Teas"))
    loaded = load_rows(tmp_path, rows, category="Teas")
    assert check(loaded, "other_category") == (1, "1.00", True)
    assert check(loaded, "unknown_item") == (1, "1.50", True)
    assert reconciles(loaded)


def test_codes_keep_or_find_their_zeros(tmp_path: Path) -> None:
    rows = sales_rows(4)
    for row in rows[:12]:
        row["sku"] = str(row["sku"]).lstrip("0")
    rows[20]["sku"] = f" {rows[20]['sku']}  "
    loaded = load_rows(tmp_path, rows)
    assert [item.code for item in loaded.catalogue.items] == ["0010", "0011", "0012", "0013"]
    assert check(loaded, "similar_code")[0] == 13
    assert (loaded.panel.units == 10.0).all()


def test_price_instead_of_revenue_is_exact(tmp_path: Path) -> None:
    rows = [
        {"store": "S01", "week": monday(w).isoformat(), "sku": "0010", "units": "0.333", "price": "10.07"}
        for w in range(10)
    ]
    loaded = load_rows(tmp_path, rows)
    assert loaded.report.money_read == Decimal("0.333") * Decimal("10.07") * 10
    assert loaded.panel.units[0, 0] == pytest.approx(0.333)
    assert any("weighed" in note for note in loaded.report.notes)


def test_blank_revenue_takes_the_price(tmp_path: Path) -> None:
    rows = [{**row, "price": "2.555"} for row in sales_rows(4)]
    rows[0]["sales_value"] = ""
    loaded = load_rows(tmp_path, rows)
    assert loaded.report.money_read == Decimal("1380.00") - Decimal("25.00") + Decimal("25.550")
    assert reconciles(loaded)


def test_money_with_many_decimals_stays_exact(tmp_path: Path) -> None:
    rows = sales_rows(4)
    for k, row in enumerate(rows):
        row["sales_value"] = f"2{k % 7}.{k:013d}1"
    rows[5]["qty"] = "x"
    loaded = load_rows(tmp_path, rows)
    assert loaded.report.money_read == sum(Decimal(str(row["sales_value"])) for row in rows)
    assert check(loaded, "unreadable_number")[1] == str(rows[5]["sales_value"])
    assert reconciles(loaded)


def test_closed_store_is_set_aside(tmp_path: Path) -> None:
    rows = [
        row for row in sales_rows(30) if row["store_no"] != "S02" or str(row["week_commencing"]) < "2024-03"
    ]
    loaded = load_rows(tmp_path, rows, baseline_weeks=8)
    assert [store.code for store in loaded.catalogue.stores] == ["S01", "S03"]
    assert check(loaded, "closed_store")[0] == 9 * 4
    assert reconciles(loaded)


def test_nothing_usable_says_why(tmp_path: Path) -> None:
    rows = [{**row, "sku": f"X{row['sku']}"} for row in sales_rows(4)]
    with pytest.raises(DataError, match=r"no sales row could be used.*not in the items table \(48\)"):
        load_rows(tmp_path, rows)


def test_gtin_check_digits(tmp_path: Path) -> None:
    # GS1 General Specifications; worked examples of GS1 member organisations.
    published = [
        ("890400021003", 7), ("03600024145", 7), ("629104150021", 3),
        ("590123412345", 7), ("400638133393", 1), ("9638507", 4),
    ]  # fmt: skip
    for body, digit in published:
        assert check_digit(body) == digit
        assert check_digit("000" + body) == digit
        assert sum(check_digit(f"{(int(body[0]) + k) % 10}{body[1:]}") == digit for k in range(1, 10)) == 0
    assert is_valid("4006381333931")
    assert not is_valid("4006381333932")
    assert not is_valid("400638133393")
    items = [{**row, "ean": "4006381333931"} for row in item_rows()]
    items[2]["ean"] = "4006381333932"
    loaded = load_rows(tmp_path, sales_rows(4), items)
    found = next(c for c in loaded.report.checks if c.code == "gtin_check_digit")
    assert (found.rows, found.examples) == (1, (("items.csv", 4, "4006381333932"),))


@st.composite
def _tables(draw: st.DrawFn) -> tuple[list[Row], str, str]:
    """Random rows with random defects, and the delimiter and decimal mark to write them with."""
    delimiter, mark = draw(st.sampled_from([(",", "."), (";", ","), ("\t", "."), ("|", ",")]))
    rows: list[Row] = []
    for _k in range(draw(st.integers(1, 25))):
        units: object = draw(st.one_of(st.integers(-3, 40), st.sampled_from(["", "x", "1000000"])))
        cents = draw(st.integers(-500, 10**7))
        money: object = draw(
            st.sampled_from([f"{Decimal(cents).scaleb(-2):.2f}".replace(".", mark), "", "?!"])
        )
        rows.append(
            _row(
                draw(st.sampled_from(["S01", "S02", "Total", ""])),
                draw(st.integers(0, 5)),
                draw(st.sampled_from(["0010", "0011", "10", "9999", ""])),
                units,
                money,
                note=draw(st.sampled_from(["", 'say "tea"', "a,b;c|d", "é"])),
            )
        )
    # Something that is always usable, so that loading has an answer; it also shows the decimal mark.
    rows += [_row("S03", 0, "0012", 4, f"8{mark}05"), _row("S03", 5, "0013", 4, f"16{mark}50")]
    random.Random(draw(st.integers(0, 99))).shuffle(rows)
    return rows, delimiter, mark


@given(_tables())
@settings(max_examples=60, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_random_tables_come_back_and_reconcile(tmp_path: Path, case: tuple[list[Row], str, str]) -> None:
    rows, delimiter, mark = case
    write_csv(tmp_path / "sales.csv", rows, delimiter)
    write_csv(tmp_path / "items.csv", item_rows())
    from_files = load(request_from_folder(tmp_path))
    expected = sum(
        (
            Decimal(str(row["sales_value"]).replace(mark, "."))
            for row in rows
            if str(row["sales_value"]) not in ("", "?!")
        ),
        Decimal(0),
    )
    assert from_files.report.rows_read == len(rows)
    assert from_files.report.money_read == expected
    assert reconciles(from_files)
    aside = set(from_files.set_aside["row"])
    for number, row in enumerate(rows, start=2):
        if number in aside:
            kept = from_files.set_aside[from_files.set_aside["row"] == number].iloc[0]
            assert [kept[h] for h in row] == [str(value).strip() for value in row.values()]
