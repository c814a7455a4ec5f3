"""Columns are found under the names real exports give them; questions of meaning are asked."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from planner.base.errors import DataError
from planner.sales.columns import RawTable, column_of
from planner.sales.matching import match, plain
from planner.sales.request import LoadRequest
from planner.sales.synonyms import COLUMNS
from tests.sales.files import load_rows, sales_rows


def _table(name: str, headers: list[str]) -> RawTable:
    columns = {header: column_of([str(k)]) for k, header in enumerate(headers)}
    return RawTable(name, f"{name}.csv", columns, np.array([2]))


def _match(name: str, headers: list[str], *matches: tuple[str, str, str]) -> dict[str, str]:
    return match(_table(name, headers), LoadRequest(Path("s"), Path("i"), matches=matches)).names


SALES = {"store": "store_no", "week": "week_commencing", "item": "sku", "units": "qty", "revenue": "turnover"}


@pytest.mark.parametrize(
    ("ours", "theirs"),
    [
        ("units", "Units"), ("units", "QTY"), ("units", "Quantity Sold"), ("units", "Sales Qty"),
        ("revenue", "sales_value"), ("revenue", "Revenue (EUR)"), ("revenue", "Turnover"),
        ("revenue", "SalesValue_GBP"), ("revenue", "sales value [€]"),
        ("item", "SKU"), ("item", "Item Code"), ("item", "product-id"), ("item", "EAN"),
        ("store", "StoreNo"), ("store", "Shop"), ("store", "Branch Code"),
        ("week", "WEEK_COMMENCING"), ("week", "Fiscal Week"), ("week", "week"),
    ],
)  # fmt: skip
def test_synonyms(ours: str, theirs: str) -> None:
    headers = {**SALES, ours: theirs}
    assert _match("sales", list(headers.values())) == headers


@pytest.mark.parametrize(
    ("table", "headers", "expected"),
    [
        ("items", ["sku", "width_cm", "facings", "unit_cost", "vat"],
         {"item": "sku", "width_cm": "width_cm", "facings": "facings", "cost": "unit_cost",
          "vat_rate": "vat"}),
        ("items", ["sku", "ean", "item_name", "sub_category", "vendor", "private_label", "pack_size"],
         {"item": "sku", "gtin": "ean", "description": "item_name", "segment": "sub_category",
          "supplier": "vendor", "own_label": "private_label", "content": "pack_size"}),
        ("stores", ["store_no", "shelf_cm", "store_cluster"],
         {"store": "store_no", "space_cm": "shelf_cm", "cluster": "store_cluster"}),
        ("shoppers", ["store", "week", "footfall"],
         {"store": "store", "week": "week", "shoppers": "footfall"}),
        ("shoppers", ["store", "week", "Visitors"],
         {"store": "store", "week": "week", "shoppers": "Visitors"}),
        ("shoppers", ["store", "date", "customers"],
         {"store": "store", "date": "date", "shoppers": "customers"}),
        ("costs", ["article_no", "cost_price", "from_week"],
         {"item": "article_no", "cost": "cost_price", "from": "from_week"}),
        ("ranges", ["store_no", "sku", "first_week", "last_week"],
         {"store": "store_no", "item": "sku", "first_week": "first_week", "last_week": "last_week"}),
        ("successors", ["old_sku", "new_sku", "changeover", "pack_factor"],
         {"old_item": "old_sku", "new_item": "new_sku", "date": "changeover", "pack_factor": "pack_factor"}),
        ("sales", [*SALES.values(), "on_promo", "shelf_price", "days_oos", "Unit Cost"],
         {**SALES, "promotion": "on_promo", "regular_price": "shelf_price", "days_out_of_stock": "days_oos",
          "cost": "Unit Cost"}),
        ("offers", ["sku", "clusters", "planned_price", "unit_cost"],
         {"item": "sku", "clusters": "clusters", "price": "planned_price", "cost": "unit_cost"}),
    ],
)  # fmt: skip
def test_tables(table: str, headers: list[str], expected: dict[str, str]) -> None:
    assert _match(table, headers) == expected


def test_item_code_before_item_name() -> None:
    found = _match("items", ["Item", "Item Code", "Segment"])
    assert found["item"] == "Item Code"
    assert found["description"] == "Item"


def test_no_name_is_claimed_twice_in_one_tier() -> None:
    for table, columns in COLUMNS.items():
        for ours, tiers in columns.items():
            names = [plain(name) for tier in tiers for name in tier.split()]
            assert len(names) == len(set(names)), (table, ours)
            assert plain(ours) in names or ours in ("name", "size"), (table, ours)


def test_missing_column_names_file_columns_and_option() -> None:
    with pytest.raises(DataError) as caught:
        _match("sales", ["store_no", "week", "sku", "volumen", "turnover"])
    said = str(caught.value)
    for word in ("sales.csv", "store_no, week, sku, volumen, turnover", "units", "--match sales.units="):
        assert word in said
    assert caught.value.exit_code == 3


def test_rival_columns_are_asked() -> None:
    headers = [*SALES.values(), "units"]
    with pytest.raises(DataError, match=r"'qty' and 'units'.*--match sales\.units=qty"):
        _match("sales", headers)
    assert _match("sales", headers, ("sales", "units", "units"))["units"] == "units"


def test_rivals_with_equal_cells_are_no_question() -> None:
    table = _table("sales", list(SALES.values()))
    table.columns["units"] = table.columns["qty"]
    assert match(table, LoadRequest(Path("s"), Path("i"))).names["units"] == "qty"


def test_describing_columns_are_no_question() -> None:
    found = _match("stores", ["store_no", "area", "region", "store_format", "cluster"])
    assert found == {"store": "store_no", "region": "region", "cluster": "cluster"}
    found = _match("items", ["sku", "product_name", "description", "segment", "Sub Category"])
    assert (found["description"], found["segment"]) == ("description", "segment")


def test_names_with_spaces_are_quoted_in_the_remedy() -> None:
    with pytest.raises(DataError, match=r"--match sales\.units='Sales Qty'"):
        _match("sales", ["store", "week", "sku", "Sales Qty", "units", "turnover"])


def test_overrides() -> None:
    headers = ["A", "B", "C", "D", "E"]
    said = [("sales", ours, theirs) for ours, theirs in zip(SALES, headers, strict=True)]
    assert _match("sales", headers, *said) == dict(zip(SALES, headers, strict=True))
    with pytest.raises(DataError, match=r"no column 'Z'.*A, B, C, D, E"):
        _match("sales", headers, *said[:-1], ("sales", "revenue", "Z"))
    with pytest.raises(DataError, match="Did you mean 'units'"):
        _match("sales", list(SALES.values()), ("sales", "unit", "qty"))


def test_report_lists_every_match(tmp_path: Path) -> None:
    loaded = load_rows(tmp_path, sales_rows(4))
    assert ("sales", "units", "qty") in loaded.report.matches
    assert ("items", "segment", "segment") in loaded.report.matches
    assert len(loaded.report.matches) == 5 + 4


def test_segments_from_columns(tmp_path: Path) -> None:
    loaded = load_rows(tmp_path, sales_rows(4), segment_by=("Brand", "segment"))
    assert loaded.catalogue.segments == ("Oakleaf / camomile", "Oakleaf / mint")
    with pytest.raises(DataError, match=r"items\.csv.*no column 'colour'.*brand.*--segment-by"):
        load_rows(tmp_path, sales_rows(4), segment_by=("colour",))


def test_no_segment_column_is_asked(tmp_path: Path) -> None:
    items = [{"sku": code, "aroma": "x"} for code in ("0010", "0011", "0012", "0013")]
    with pytest.raises(DataError, match=r"segment.*sku, aroma.*--match items\.segment"):
        load_rows(tmp_path, sales_rows(4), items)
