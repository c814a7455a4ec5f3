"""Paid, regular and promotion prices of every cell."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from planner.sales.prices import PriceSettings, fill_prices, running_level
from tests.sales.files import Row, load_rows, sales_rows

NAN = np.nan


def _cut(rows: list[Row], share: float, weeks: range, item: str = "0010", **more: object) -> None:
    dates = {row["week_commencing"] for row in rows}
    chosen = {d for k, d in enumerate(sorted(dates, key=str)) if k in weeks}
    for row in rows:
        if row["sku"] == item and row["week_commencing"] in chosen:
            row["sales_value"] = f"{float(str(row['sales_value'])) * share:.2f}"
            row.update(more)


def test_running_level_bridges_cuts_and_keeps_steps() -> None:
    paid = np.array([2.0] * 10 + [1.5] * 2 + [2.0] * 8 + [2.4] * 10 + [1.8] * 3 + [2.4] * 7 + [2.2] * 20)
    level = running_level(paid, 6)
    expected = np.array([2.0] * 20 + [2.4] * 20 + [2.2] * 20)
    np.testing.assert_array_equal(level, expected)


def test_a_cut_at_the_end_is_a_promotion_a_lasting_one_a_new_price() -> None:
    assert running_level(np.array([2.0] * 30 + [1.5] * 3), 6)[-1] == 2.0
    assert running_level(np.array([2.0] * 30 + [1.5] * 7), 6)[-1] == 1.5
    assert running_level(np.array([1.5] * 2 + [2.0] * 30), 6)[0] == 2.0
    assert running_level(np.array([2.0] * 30 + [2.5]), 6)[-1] == 2.5


def test_inferred_regular_price_and_promotion(tmp_path: Path) -> None:
    rows = sales_rows(30)
    _cut(rows, 0.7, range(8, 10))
    _cut(rows, 1.2, range(20, 30))
    loaded = load_rows(tmp_path, rows)
    panel = loaded.panel
    first = panel.store_index == 0
    np.testing.assert_allclose(panel.regular_price[first, 0], [2.5] * 20 + [3.0] * 10)
    np.testing.assert_allclose(panel.price[first, 0], [2.5] * 8 + [1.75] * 2 + [2.5] * 10 + [3.0] * 10)
    assert panel.promotion[first, 0].tolist() == [0.0] * 8 + [1.0] * 2 + [0.0] * 20
    assert panel.promotion[first, 1].sum() == 0.0
    assert loaded.base.price[0, 0] == pytest.approx(3.0)


def test_promotion_flag_and_regular_price_columns(tmp_path: Path) -> None:
    rows = [{**row, "on_promo": "N", "shelf_price": "2.60"} for row in sales_rows(20)]
    _cut(rows, 0.97, range(8, 10), on_promo="Multibuy")
    loaded = load_rows(tmp_path, rows)
    panel = loaded.panel
    first = panel.store_index == 0
    assert panel.promotion[first, 0].tolist() == [0.0] * 8 + [1.0] * 2 + [0.0] * 10
    np.testing.assert_allclose(panel.regular_price, 2.6)
    np.testing.assert_allclose(panel.price[first, 0][8:10], 2.5 * 0.97)
    np.testing.assert_allclose(loaded.base.price, 2.6)


def test_flag_without_regular_column_carries_the_price_before(tmp_path: Path) -> None:
    rows = [{**row, "promo": 0} for row in sales_rows(20)]
    _cut(rows, 0.6, range(16, 20), promo=1)
    loaded = load_rows(tmp_path, rows)
    np.testing.assert_allclose(loaded.panel.regular_price[:, 0], 2.5)
    assert loaded.base.price[0, 0] == pytest.approx(2.5)


def test_unsold_cells_carry_the_price_in_force(tmp_path: Path) -> None:
    rows = sales_rows(20)
    _cut(rows, 0.7, range(8, 10))
    gone = {str(row["week_commencing"]) for row in rows[8 * 4 : 9 * 4]}
    rows = [
        r
        for r in rows
        if not (r["sku"] == "0010" and r["store_no"] == "S01" and r["week_commencing"] in gone)
    ]
    rows = [r for r in rows if not (r["sku"] == "0013" and str(r["week_commencing"]) < "2024-02-19")]
    panel = load_rows(tmp_path, rows).panel
    assert panel.units[8, 0] == 0.0
    assert panel.price[8, 0] == pytest.approx(1.75)
    assert panel.promotion[8, 0] == 1.0
    assert panel.price[0, 3] == pytest.approx(4.0)
    assert (panel.price > 0.0).all()
    assert (panel.regular_price > 0.0).all()


def test_zero_rows_with_a_price_show_it(tmp_path: Path) -> None:
    rows = [{**row, "price": f"{float(str(row['sales_value'])) / 10:.2f}"} for row in sales_rows(20)]
    rows[0].update(qty=0, sales_value=0, price="2.20")
    panel = load_rows(tmp_path, rows).panel
    assert panel.price[0, 0] == pytest.approx(2.2)


def test_dear_stores_keep_their_own_level() -> None:
    cluster = np.zeros(5, dtype=np.int64)
    paid = np.full((5, 20, 1), 2.0)
    paid[4] = 2.3
    paid[:, 10] *= 0.75
    paid[4, 15] = NAN
    shown = np.full(paid.shape, NAN)
    cells = fill_prices(paid, shown, None, None, cluster, PriceSettings())
    np.testing.assert_allclose(cells.regular[4, :, 0], 2.3)
    np.testing.assert_allclose(cells.regular[0, :, 0], 2.0)
    assert cells.price[4, 15, 0] == pytest.approx(2.3)
    assert cells.promotion[:, 10, 0].tolist() == [1.0] * 5
    assert cells.promotion.sum() == 5.0


def test_clusters_have_their_own_prices_and_borrow_the_chains() -> None:
    cluster = np.array([0, 0, 1, 1])
    paid = np.full((4, 12, 2), 2.0)
    paid[2:, :, 0] = 3.0
    paid[2:, :, 1] = NAN
    shown = np.full(paid.shape, NAN)
    cells = fill_prices(paid, shown, None, None, cluster, PriceSettings())
    assert cells.regular[2, 0, 0] == 3.0
    assert cells.regular[2, 0, 1] == 2.0
    assert not np.isnan(cells.price).any()


def test_item_sold_only_on_promotion_has_that_price() -> None:
    paid = np.full((2, 6, 1), 1.5)
    shown = np.full(paid.shape, NAN)
    cells = fill_prices(paid, shown, None, np.ones(paid.shape), np.zeros(2, dtype=np.int64), PriceSettings())
    assert (cells.regular == 1.5).all()
    assert (cells.promotion == 1.0).all()


def test_item_without_any_price_is_unknown() -> None:
    paid = np.full((2, 6, 1), NAN)
    cells = fill_prices(paid, paid, None, None, np.zeros(2, dtype=np.int64), PriceSettings())
    assert np.isnan(cells.price).all()
    assert cells.promotion.sum() == 0.0


def test_net_sales_become_consumer_prices(tmp_path: Path) -> None:
    rows = [{k if k != "sales_value" else "net_sales": v for k, v in row.items()} for row in sales_rows(10)]
    items = [
        {"sku": code, "segment": "tea", "vat_rate": "20%", "unit_cost": "1.00"}
        for code in ("0010", "0011", "0012", "0013")
    ]
    loaded = load_rows(tmp_path, rows, items)
    np.testing.assert_allclose(loaded.panel.price[0], [3.0, 3.6, 2.4, 4.8])
    np.testing.assert_allclose(loaded.base.net_price, [[2.5, 3.0, 2.0, 4.0]])
    np.testing.assert_allclose(loaded.base.margin, [[1.5, 2.0, 1.0, 3.0]])
    assert loaded.report.money_read == 3 * 10 * 115
    assert any("net of VAT" in note for note in loaded.report.notes)


def test_cluster_that_dropped_an_item_follows_the_others_prices() -> None:
    cluster = np.array([0, 1])
    paid = np.full((2, 30, 1), 2.0)
    paid[1] = 2.2
    paid[0, 15:] = 3.0
    paid[1, 10:] = NAN
    cells = fill_prices(paid, np.full(paid.shape, NAN), None, None, cluster, PriceSettings())
    np.testing.assert_allclose(cells.regular[1, :, 0], [2.2] * 15 + [3.3] * 15)
