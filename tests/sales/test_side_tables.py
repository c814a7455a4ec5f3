"""Stores, shoppers, costs, offers, successors, and the defaults when they are missing."""

from __future__ import annotations

from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest

from planner.base.errors import CancelledError, DataError
from planner.sales.load import load, request_from_folder
from tests.sales.files import ITEMS, STORES, Row, check, item_rows, load_rows, monday, reconciles, sales_rows

CLUSTERS = {"S01": "City", "S02": "Coast", "S03": "City"}


def _stores(**more: object) -> list[Row]:
    return [{"store": store, "cluster": CLUSTERS[store], **more} for store in STORES]


def _items(**more: object) -> list[Row]:
    return [{**row, **more} for row in item_rows()]


def test_defaults_are_said(tmp_path: Path) -> None:
    loaded = load_rows(tmp_path)
    base = loaded.base
    assert loaded.catalogue.clusters == ("all",)
    assert loaded.panel.shoppers is None
    assert base.shoppers is None
    assert np.isnan(base.cost).all()
    assert np.isnan(base.margin).all()
    assert not base.space_known
    assert base.space_cm.tolist() == [1.0] * 4
    assert base.space_limit.tolist() == [4.0] * 3
    np.testing.assert_array_equal(base.net_price, base.price)
    said = " ".join((*loaded.report.notes, *base.notes))
    for words in ("one cluster", "No shoppers", "No costs", "net of VAT", "number of items"):
        assert words in said


def test_base_week(tmp_path: Path) -> None:
    rows = sales_rows(20)
    rows[19 * 4]["qty"], rows[19 * 4]["sales_value"] = 30, "75.00"
    loaded = load_rows(tmp_path, rows, baseline_weeks=4)
    base = loaded.base
    assert (base.weeks, base.first_week) == (4, monday(16))
    assert base.units[0, 0] == pytest.approx(15.0)
    assert base.units[1, 0] == pytest.approx(10.0)
    assert load_rows(tmp_path, rows, baseline_weeks=52).base.weeks == 20


def test_clusters_and_prices(tmp_path: Path) -> None:
    rows = sales_rows(20)
    for row in rows:
        if row["store_no"] == "S02":
            row["sales_value"] = f"{float(str(row['sales_value'])) * 1.1:.2f}"
    loaded = load_rows(tmp_path, rows, stores=_stores())
    assert loaded.catalogue.clusters == ("City", "Coast")
    assert loaded.catalogue.cluster_of_store() == [0, 1, 0]
    np.testing.assert_allclose(loaded.base.price, [[2.5, 3.0, 2.0, 4.0], [2.75, 3.3, 2.2, 4.4]])


def test_space(tmp_path: Path) -> None:
    items = _items(width_cm="8,5")
    for item, facings, least in zip(items, ["2", "", "1", "3"], ["1", "", "2", ""], strict=True):
        item.update(facings=facings, min_facings=least)
    stores = [dict(row, shelf_cm=room) for row, room in zip(_stores(), ["70", "60", ""], strict=True)]
    loaded = load_rows(tmp_path, items=items, stores=stores)
    base = loaded.base
    np.testing.assert_allclose(base.space_cm, [17.0, 8.5, 17.0, 25.5])
    np.testing.assert_allclose(base.space_limit, [70.0, 68.0, 68.0])
    assert base.space_known
    assert any("raised to that: S02" in note for note in base.notes)
    assert any("missing for 1 stores" in note and "S03" in note for note in base.notes)


def test_missing_space_takes_the_segments_median(tmp_path: Path) -> None:
    items = _items()
    items[0]["space_cm"], items[2]["space_cm"], items[3]["space_cm"] = 20, 10, 12
    base = load_rows(tmp_path, items=items).base
    assert base.space_cm.tolist() == [20.0, 20.0, 10.0, 12.0]
    assert any("missing for 1 items" in note and "0011" in note for note in base.notes)


def test_lengths_in_millimetres_and_metres(tmp_path: Path) -> None:
    items = _items(width_mm=85)
    loaded = load_rows(tmp_path, items=items, stores=_stores(shelf_m="1.2"))
    np.testing.assert_allclose(loaded.base.space_cm, 8.5)
    np.testing.assert_allclose(loaded.base.space_limit, 120.0)


def test_costs_from_their_week(tmp_path: Path) -> None:
    items = _items(unit_cost="1.00", vat_rate="0.2")
    items[3]["unit_cost"] = ""
    costs = [
        {"sku": "0010", "unit_cost": "1.10", "from_week": ""},
        {"sku": "0010", "unit_cost": "1.30", "from_week": monday(19).isoformat()},
        {"sku": "0010", "unit_cost": "1.20", "from_week": monday(4).isoformat()},
        {"sku": "0011", "unit_cost": "9.99", "from_week": monday(20).isoformat()},
    ]
    loaded = load_rows(tmp_path, items=items, costs=costs)
    np.testing.assert_allclose(loaded.base.cost, [1.3, 1.0, 1.0, np.nan])
    np.testing.assert_allclose(loaded.base.margin[0], [2.5 / 1.2 - 1.3, 1.5, 2 / 1.2 - 1, np.nan])
    assert loaded.catalogue.items[0].cost == 1.3
    assert loaded.catalogue.items[3].cost is None
    assert any("valid only after the last week" in note for note in loaded.report.notes)
    assert any("Cost is missing for 1 items" in note and "0013" in note for note in loaded.base.notes)


def test_costs_in_the_sales_and_margin_rates(tmp_path: Path) -> None:
    rows = [{**row, "unit_cost": "0.90" if row["sku"] == "0010" else ""} for row in sales_rows(20)]
    items = _items(margin_rate="40")
    items[1]["unit_cost"] = "1.50"
    loaded = load_rows(tmp_path, rows, items)
    np.testing.assert_allclose(loaded.base.cost, [0.9, 1.5, 1.2, 2.4])


def test_cost_above_price_is_reported(tmp_path: Path) -> None:
    items = _items(unit_cost="1.00")
    items[2]["unit_cost"] = "2.50"
    found = next(c for c in load_rows(tmp_path, items=items).report.checks if c.code == "cost_above_price")
    assert found.examples == (("items.csv", 0, "0012"),)


def test_shoppers(tmp_path: Path) -> None:
    shoppers = [
        {"store": store, "week": monday(w).isoformat(), "footfall": 1000 + 10 * w}
        for store in STORES[:2]
        for w in range(20)
    ]
    shoppers[3]["footfall"] = ""
    shoppers.append(dict(shoppers[0]))
    loaded = load_rows(tmp_path, shoppers=shoppers, baseline_weeks=10)
    panel = loaded.panel
    assert panel.shoppers is not None
    assert panel.shoppers[:5].tolist() == [1000.0, 1010.0, 1020.0, 1100.0, 1040.0]
    assert loaded.base.shoppers is not None
    assert loaded.base.shoppers[1] == pytest.approx(1145.0)
    per_unit = panel.shoppers[:40].sum() / (40 * 40.0)
    np.testing.assert_allclose(panel.shoppers[40:], 40.0 * per_unit)
    said = " ".join(loaded.report.notes)
    assert "missing in 1 store-weeks" in said
    assert "1 stores have no shopper counts" in said


def test_shoppers_of_other_stores_are_not_used(tmp_path: Path) -> None:
    loaded = load_rows(tmp_path, shoppers=[{"store": "S77", "week": "2024-01-01", "shoppers": 50}])
    assert loaded.panel.shoppers is None
    assert any("No shopper count" in note for note in loaded.report.notes)


def test_daily_shoppers_are_added_up(tmp_path: Path) -> None:
    shoppers = [
        {"store": store, "date": f"2024-01-{day:02d}", "visitors": 10}
        for store in STORES
        for day in range(1, 15)
    ]
    panel = load_rows(tmp_path, sales_rows(2), shoppers=shoppers).panel
    assert panel.shoppers is not None
    assert panel.shoppers.tolist() == [70.0] * 6


def _offer(code: str, **more: object) -> Row:
    return {"sku": code, "segment": "mint", "brand": "New", "price": "2.80", "unit_cost": "1.20", **more}


def test_offers_stand_last(tmp_path: Path) -> None:
    offers = [_offer("0900", clusters="coast; Moon"), _offer("0001", clusters="all"), _offer("0011")]
    offers.append(_offer("0902", segment=""))
    loaded = load_rows(tmp_path, items=_items(unit_cost=1), stores=_stores(), offers=offers)
    items = loaded.catalogue.items
    assert [item.code for item in items] == [*ITEMS, "0900", "0001"]
    assert [item.is_offer for item in items] == [False] * 4 + [True] * 2
    assert items[4].offered_to == ("Coast",)
    assert items[5].offered_to == ()
    assert any("0900 names Moon" in note for note in loaded.report.notes)
    assert (items[4].price, items[4].cost) == (2.8, 1.2)
    assert not loaded.panel.listed[:, 4:].any()
    assert not loaded.base.today[:, 4:].any()
    assert loaded.panel.on_sale[:, 4:].sum() == 0.0
    np.testing.assert_allclose(loaded.base.price[:, 4], 2.8)
    assert check(loaded, "offer_already_sold")[0] == 1
    assert check(loaded, "item_without_segment")[0] == 1


def test_unsold_items_with_price_and_cost_are_offers(tmp_path: Path) -> None:
    items = [*_items(unit_cost=1), _offer("0800"), {"sku": "0801", "segment": "mint"}]
    items.append({"sku": "0802", "segment": "mint"})
    ranges = [{"store": "S01", "sku": "0802", "first_week": "", "last_week": ""}]
    loaded = load_rows(tmp_path, items=items, ranges=ranges)
    assert [(item.code, item.is_offer) for item in loaded.catalogue.items] == [
        *[(code, False) for code in ITEMS],
        ("0802", False),
        ("0800", True),
    ]
    assert loaded.base.today[:, 4].tolist() == [True, False, False]
    assert check(loaded, "never_sold")[0] == 3


def test_successors_are_one_history(tmp_path: Path) -> None:
    rows = sales_rows(20)
    for row in rows:
        if row["sku"] == "0011":
            late = str(row["week_commencing"]) >= monday(10).isoformat()
            row["sku"] = "0021" if late else "0020"
    items = [row for row in item_rows() if row["sku"] != "0011"]
    items.append({"sku": "0021", "segment": "mint", "brand": "Oakleaf"})
    successors = [{"old_sku": "0020", "new_sku": "0021", "pack_factor": "0.8"}]
    loaded = load_rows(tmp_path, rows, items, successors=successors)
    j = loaded.catalogue.item_index()["0021"]
    assert "0020" not in loaded.catalogue.item_index()
    # A new pack holds 0.8 old ones: 10 old units are 12.5 new ones, for the same money.
    np.testing.assert_allclose(loaded.panel.units[:20, j], [12.5] * 10 + [10.0] * 10)
    np.testing.assert_allclose(loaded.panel.price[:20, j], [2.4] * 10 + [3.0] * 10)
    assert loaded.panel.listed[:, j].all()
    assert loaded.report.events == ()
    assert check(loaded, "successor_row") == (30, "900.00", False)
    assert any("0020 was replaced by 0021" in note for note in loaded.report.notes)
    assert loaded.report.money_used == Decimal("6900.00")
    assert reconciles(loaded)


def test_successor_ranges_join_over_a_short_gap(tmp_path: Path) -> None:
    rows = sales_rows(20)
    for row in rows:
        if row["sku"] == "0011" and str(row["week_commencing"]) < monday(10).isoformat():
            row["sku"] = "0020"
    gap = {monday(w).isoformat() for w in (8, 9)}
    rows = [r for r in rows if not (r["sku"] == "0020" and r["week_commencing"] in gap)]
    ranges = [
        {"store": store, "sku": item, "first_week": first, "last_week": last}
        for store in STORES
        for item, first, last in (
            ("0010", "", ""), ("0012", "", ""), ("0013", "", ""),
            ("0020", "", monday(7).isoformat()), ("0011", monday(10).isoformat(), ""),
        )
    ]  # fmt: skip
    successors = [{"old_item": "0020", "new_item": "0011"}]
    loaded = load_rows(tmp_path, rows, ranges=ranges, successors=successors)
    j = loaded.catalogue.item_index()["0011"]
    assert loaded.panel.listed[:, j].all()
    assert loaded.panel.on_sale[:20, j].tolist() == [1.0] * 8 + [0.0] * 2 + [1.0] * 10
    assert loaded.report.events == ()


def test_successor_chains_and_rings(tmp_path: Path) -> None:
    rows = sales_rows(6)
    chain = [{"old": "0010", "new": "0011", "factor": 2}, {"old": "0011", "new": "0012", "factor": 2}]
    loaded = load_rows(tmp_path, rows, successors=chain)
    assert [item.code for item in loaded.catalogue.items] == ["0012", "0013"]
    assert loaded.panel.units[0, 0] == pytest.approx(10 / 4 + 10 / 2 + 10)
    ring = [*chain, {"old": "0012", "new": "0010", "factor": 1}]
    with pytest.raises(DataError, match=r"successors\.csv.*would replace itself"):
        load_rows(tmp_path, rows, successors=ring)


def test_item_attributes(tmp_path: Path) -> None:
    items = _items(vat_rate="7", net_content="0.5", content_unit="l", private_label="no", aroma="mild")
    for item, price_tier, servings, name in zip(items, "AABB", (10, 20, 20, 40), ITEMS, strict=True):
        item.update(tier=price_tier, servings=servings, remark=name + "x", supplier="Alder")
    items[1].update(private_label="Yes", net_content="250", content_unit="ml", keep="x")
    catalogue = load_rows(tmp_path, items=items).catalogue
    second = catalogue.items[1]
    assert (second.content, second.content_unit) == (0.25, "l")
    assert (second.own_label, second.keep, second.vat_rate, second.supplier) == (True, True, 0.07, "Alder")
    assert dict(second.attributes) == {"tier": "A", "servings": 20.0, "remark": "0011x"}


def test_duplicate_item_and_store_rows(tmp_path: Path) -> None:
    items = [*item_rows(), {**item_rows()[0], "segment": "other"}]
    loaded = load_rows(tmp_path, items=items, stores=[*_stores(), _stores()[0]])
    assert check(loaded, "duplicate_item")[0] == 1
    assert check(loaded, "duplicate_store")[0] == 1
    assert loaded.catalogue.items[0].segment == "mint"


def test_unreadable_side_cells_are_reported(tmp_path: Path) -> None:
    items = _items(unit_cost="1.00")
    items[0]["unit_cost"] = "dear"
    costs = [{"sku": "0011", "cost": "?!", "from": "2024-01-01"}]
    ranges = [{"store": "S01", "sku": "0010", "first_week": "early", "last_week": ""}]
    loaded = load_rows(tmp_path, items=items, costs=costs, ranges=ranges)
    found = next(c for c in loaded.report.checks if c.code == "unreadable_cell")
    assert found.rows == 3
    assert ("items.csv", 2, "unit_cost=dear") in found.examples
    assert ("ranges.csv", 2, "first_week=early") in found.examples


def test_rows_for_unknown_codes_are_reported(tmp_path: Path) -> None:
    items = [*item_rows(), {"sku": "", "description": "no code", "segment": "mint"}]
    costs = [{"sku": "0010", "cost": 1, "from": ""}, {"sku": "4711", "cost": 1, "from": ""}]
    ranges = [
        {
            "store": "S01",
            "sku": "0010",
            "first_week": monday(8).isoformat(),
            "last_week": monday(3).isoformat(),
        },
        {"store": "S09", "sku": "0010", "first_week": "", "last_week": ""},
    ]
    loaded = load_rows(tmp_path, items=items, costs=costs, ranges=ranges)
    found = {c.code: c for c in loaded.report.checks}
    assert (found["unknown_code"].rows, found["unknown_code"].examples) == (
        2,
        (
            ("ranges.csv", 3, "store=S09, sku=0010, first_week=, last_week="),
            ("costs.csv", 3, "sku=4711, cost=1, from="),
        ),
    )
    assert found["blank_item"].examples[0][:2] == ("items.csv", 6)
    assert found["backward_range"].examples[0][:2] == ("ranges.csv", 2)
    assert loaded.panel.listed.all()


def test_store_weeks_without_sales_are_no_markets(tmp_path: Path) -> None:
    gone = monday(7).isoformat()
    rows = [r for r in sales_rows(20) if not (r["store_no"] == "S02" and r["week_commencing"] == gone)]
    loaded = load_rows(tmp_path, rows)
    assert loaded.panel.n_markets == 59
    assert (loaded.panel.on_sale == 1.0).all()
    assert any("1 store-weeks hold no sales" in note for note in loaded.report.notes)


class _Stop:
    """Progress that asks to stop after some reports."""

    def __init__(self, after: int) -> None:
        self.steps: list[str] = []
        self.after = after

    def report(self, step: str, fraction: float | None = None) -> None:
        self.steps.append(step)

    def improved(self, answer: dict[str, object]) -> None:
        raise AssertionError("loading streams no answers")

    def cancelled(self) -> bool:
        return len(self.steps) > self.after


def test_progress_and_cancel(tmp_path: Path) -> None:
    load_rows(tmp_path)
    watched = _Stop(1000)
    load(request_from_folder(tmp_path), watched)
    assert watched.steps[0] == "Reading sales.csv"
    assert watched.steps[-1] == "Loaded"
    for after in range(1, len(watched.steps) - 2):
        with pytest.raises(CancelledError):
            load(request_from_folder(tmp_path), _Stop(after))
