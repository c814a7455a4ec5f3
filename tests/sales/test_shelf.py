"""What was on the shelf: flag, ranges table, days out of stock, inference."""

from __future__ import annotations

from datetime import date
from pathlib import Path

import numpy as np
import pytest

from planner.sales.on_sale import OnSaleSettings, improbable_gaps, infer_shelf, writes_zero_rows
from planner.sales.runs import carry, fill_forward, gaps, upper_median, window_sum
from tests.sales.files import ITEMS, STORES, check, load_rows, monday, sales_rows

RANGE_ALL = [
    {"store_no": store, "sku": item, "first_week": "2023-01-02", "last_week": ""}
    for store in STORES
    for item in ITEMS
]


def _column(loaded, name: str, store: int, item: int) -> list[float]:
    panel = loaded.panel
    return getattr(panel, name)[panel.store_index == store, item].astype(float).tolist()


def test_ranges_are_inclusive_and_blank_means_still(tmp_path: Path) -> None:
    rows = sales_rows(20)
    ranges = [dict(row) for row in RANGE_ALL]
    ranges[0].update(first_week=monday(3).isoformat(), last_week=monday(15).isoformat())
    ranges[1].update(first_week="", last_week=monday(19).isoformat())
    ranges[2].update(first_week=monday(5).isoformat(), last_week="2030-01-07")
    rows = [
        row
        for row in rows
        if not (row["store_no"] == "S01" and row["sku"] == "0010" and row["week_commencing"] < "2024-01-22")
        and not (row["store_no"] == "S01" and row["sku"] == "0010" and row["week_commencing"] > "2024-04-15")
        and not (row["store_no"] == "S01" and row["sku"] == "0012" and row["week_commencing"] < "2024-02-05")
    ]
    loaded = load_rows(tmp_path, rows, ranges=ranges)
    assert _column(loaded, "listed", 0, 0) == [0.0] * 3 + [1.0] * 13 + [0.0] * 4
    assert _column(loaded, "listed", 0, 1) == [1.0] * 20
    assert _column(loaded, "listed", 0, 2) == [0.0] * 5 + [1.0] * 15
    assert loaded.base.today[0].tolist() == [False, True, True, True]
    events = [(e.store, e.item, e.week, e.kind) for e in loaded.report.events]
    assert events == [
        ("S01", "0010", monday(3), "listed"),
        ("S01", "0012", monday(5), "listed"),
        ("S01", "0010", monday(16), "delisted"),
    ]
    assert check(loaded, "outside_range")[0] == 0


def test_listed_without_a_sale_stays_on_sale(tmp_path: Path) -> None:
    rows = [r for r in sales_rows(20) if not (r["sku"] == "0010" and str(r["week_commencing"]) > "2024-02")]
    loaded = load_rows(tmp_path, rows, ranges=RANGE_ALL)
    assert _column(loaded, "on_sale", 0, 0) == [1.0] * 20
    assert loaded.report.events == ()


def test_sales_outside_the_range_count_and_are_reported(tmp_path: Path) -> None:
    ranges = [dict(row) for row in RANGE_ALL]
    ranges[0]["last_week"] = monday(9).isoformat()
    rows = [
        row
        for row in sales_rows(20)
        if not (row["store_no"] == "S01" and row["sku"] == "0010")
        or row["week_commencing"] in [monday(w).isoformat() for w in (*range(10), 11, 18)]
    ]
    loaded = load_rows(tmp_path, rows, ranges=ranges)
    assert check(loaded, "outside_range") == (2, "50.00", False)
    # An empty week before the leftover sale belongs to the range; a lone sale much later does not join.
    assert _column(loaded, "listed", 0, 0) == [1.0] * 12 + [0.0] * 6 + [1.0, 0.0]
    assert _column(loaded, "on_sale", 0, 0)[9:13] == [1.0, 0.0, 1.0, 0.0]
    assert not loaded.base.today[0, 0]


def test_pairs_the_ranges_do_not_name_are_inferred(tmp_path: Path) -> None:
    loaded = load_rows(tmp_path, sales_rows(20), ranges=RANGE_ALL[1:])
    assert check(loaded, "not_in_ranges") == (20, "500.00", False)
    assert _column(loaded, "listed", 0, 0) == [1.0] * 20
    assert loaded.base.today.all()


def test_days_out_of_stock_and_zero_rows(tmp_path: Path) -> None:
    rows = [{**row, "days_oos": 0} for row in sales_rows(20)]
    rows[0]["days_oos"] = 3
    rows[1].update(days_oos=7, qty=0, sales_value=0)
    rows[2].update(qty=0, sales_value="0.00")
    rows[3]["days_oos"] = 7
    loaded = load_rows(tmp_path, rows, ranges=RANGE_ALL)
    assert loaded.panel.on_sale[0] == pytest.approx([4 / 7, 0.0, 1.0, 1 / 7])
    assert loaded.panel.units[0].tolist() == [10.0, 0.0, 0.0, 10.0]
    assert loaded.panel.listed.all()
    assert (loaded.panel.on_sale[1:] == 1.0).all()


def test_days_on_sale(tmp_path: Path) -> None:
    rows = [{**row, "days_on_sale": 7} for row in sales_rows(20)]
    rows[0]["days_on_sale"] = 2
    loaded = load_rows(tmp_path, rows)
    assert loaded.panel.on_sale[0] == pytest.approx([2 / 7, 1.0, 1.0, 1.0])


def test_flag_comes_first(tmp_path: Path) -> None:
    rows = [{**row, "on_sale": "Y"} for row in sales_rows(20)]
    for row in rows:
        if row["store_no"] == "S01" and row["sku"] == "0010":
            week = str(row["week_commencing"])
            if week < monday(4).isoformat() or week in (monday(8).isoformat(), monday(9).isoformat()):
                row.update(on_sale="N", qty=0, sales_value=0)
    loaded = load_rows(tmp_path, rows)
    assert _column(loaded, "listed", 0, 0) == [0.0] * 4 + [1.0] * 16
    assert _column(loaded, "on_sale", 0, 0) == [0.0] * 4 + [1.0] * 4 + [0.0] * 2 + [1.0] * 10
    assert [(e.item, e.week, e.kind) for e in loaded.report.events] == [("0010", monday(4), "listed")]


def test_a_flag_that_is_always_set_tells_nothing(tmp_path: Path) -> None:
    rows = [{**row, "on_sale": 1} for row in sales_rows(20)]
    rows = [
        r
        for r in rows
        if not (r["store_no"] == "S01" and r["sku"] == "0010" and r["week_commencing"] < "2024-02")
    ]
    loaded = load_rows(tmp_path, rows)
    assert _column(loaded, "listed", 0, 0) == [0.0] * 5 + [1.0] * 15


def test_inference_ends_and_gaps(tmp_path: Path) -> None:
    absent = {"0010": range(0, 5), "0011": range(8, 12), "0012": range(15, 20), "0013": [7]}
    rows = [
        row
        for row in sales_rows(20)
        if row["store_no"] != "S01"
        or (date.fromisoformat(str(row["week_commencing"])) - monday(0)).days // 7
        not in absent[str(row["sku"])]
    ]
    loaded = load_rows(tmp_path, rows)
    assert _column(loaded, "listed", 0, 0) == [0.0] * 5 + [1.0] * 15
    assert _column(loaded, "listed", 0, 1) == [1.0] * 20
    assert _column(loaded, "on_sale", 0, 1) == [1.0] * 8 + [0.0] * 4 + [1.0] * 8
    assert _column(loaded, "listed", 0, 2) == [1.0] * 15 + [0.0] * 5
    assert _column(loaded, "on_sale", 0, 3) == [1.0] * 20
    assert loaded.base.today[0].tolist() == [True, True, False, True]
    assert any("inferred" in note for note in loaded.report.notes)


def test_probable_gaps_of_slow_items_are_no_events(tmp_path: Path) -> None:
    rows = sales_rows(24)
    slow = [r for r in rows if r["sku"] == "0010" and date.fromisoformat(str(r["week_commencing"])).day < 8]
    for row in slow:
        row.update(qty=1, sales_value="2.50")
    rows = [r for r in rows if r["sku"] != "0010"] + slow
    loaded = load_rows(tmp_path, rows)
    assert loaded.report.events == ()
    assert (loaded.panel.on_sale == 1.0).all()


def _history(seed: int, season: float) -> tuple[np.ndarray, ...]:
    """Units and truth (S, W, J) of items with listings, delistings, stock-outs and a season."""
    rng = np.random.default_rng(seed)
    s, w, j = 30, 104, 40
    rate = np.exp(rng.normal(1.6, 0.7, size=(1, 1, j)) + rng.normal(0.0, 0.3, size=(s, 1, j)))
    year = season * np.sin(2 * np.pi * (np.arange(w)[None, :, None] / 52.0 + rng.random((1, 1, j))))
    weeks = np.arange(w)[None, :, None]
    first = np.where(rng.random((s, 1, j)) < 0.3, rng.integers(6, 60, (s, 1, j)), 0)
    last = np.where(rng.random((s, 1, j)) < 0.3, rng.integers(64, 98, (s, 1, j)), w - 1)
    listed = (weeks >= first) & (weeks <= last)
    starts = rng.random((s, w, j)) < 0.006
    out = np.zeros((s, w, j), dtype=bool)
    for k in range(4):
        out[:, k:] |= starts[:, : w - k]
    units = rng.poisson(rate * np.exp(year) * (listed & ~out)).astype(float)
    return units, listed, listed & ~out, np.broadcast_to(rate * np.exp(year), units.shape)


@pytest.mark.parametrize("season", [0.0, 0.6])
def test_inference_against_simulated_truth(season: float) -> None:
    units, listed, on_shelf, rate = _history(3, season)
    counted = np.ones(units.shape[:2], dtype=bool)
    found, shelf = infer_shelf(units, units > 0, counted, False, OnSaleSettings())
    fast = rate.mean(axis=1) > 2.0
    hit = total = extra = claimed = 0
    for truth, guess, count in ((listed, found, "recall"), (found, listed, "precision")):
        for step in (1, -1):
            change = np.diff(truth.astype(int), axis=1) == step
            answer = np.diff(guess.astype(int), axis=1) == step
            near = answer.copy()
            near[:, 1:] |= answer[:, :-1]
            near[:, :-1] |= answer[:, 1:]
            picked = change & fast[:, None, :]
            if count == "recall":
                hit, total = hit + int((picked & near).sum()), total + int(picked.sum())
            else:
                extra, claimed = extra + int((picked & ~near).sum()), claimed + int(picked.sum())
    recall, precision = hit / total, 1.0 - extra / claimed
    empty = listed & ~on_shelf & (rate.mean(axis=1) > 5.0)[:, None, :]
    found_empty = float((empty & ~shelf).sum() / empty.sum())
    print(
        f"season {season}: recall {recall:.3f}, precision {precision:.3f} of {total} events; "
        f"{found_empty:.3f} of stock-out weeks found"
    )
    assert total > 500
    assert recall > 0.9
    assert precision > 0.9
    assert found_empty > 0.9
    wrongly_empty = (on_shelf & ~shelf)[np.broadcast_to(fast[:, None, :], shelf.shape)].mean()
    assert wrongly_empty < 0.005


def test_exports_with_zero_rows_are_recognised() -> None:
    units, listed, _on_shelf, _rate = _history(5, 0.0)
    counted = np.ones(units.shape[:2], dtype=bool)
    assert writes_zero_rows(units, listed, counted)
    assert not writes_zero_rows(units, units > 0, counted)
    found, shelf = infer_shelf(units, listed, counted, True, OnSaleSettings())
    assert (found == listed).all()
    assert (shelf == listed).all()


def test_long_improbable_gap_is_off_the_range() -> None:
    units = np.full((1, 60, 1), 5.0)
    units[0, 20:40] = 0.0
    found, shelf = infer_shelf(units, units > 0, np.ones((1, 60), dtype=bool), False, OnSaleSettings())
    assert found[0, :, 0].tolist() == [True] * 20 + [False] * 20 + [True] * 20
    assert (shelf == found).all()


def test_weeks_without_the_store_do_not_count() -> None:
    units = np.full((1, 30, 1), 3.0)
    counted = np.ones((1, 30), dtype=bool)
    units[0, 10:20] = 0.0
    counted[0, 10:20] = False
    inside, start, end = improbable_gaps(
        units, units > 0, counted, gaps(units > 0, counted), OnSaleSettings()
    )
    assert not (inside | start | end).any()


def test_gaps() -> None:
    marked = np.array([0, 0, 1, 0, 0, 0, 1, 1, 0], dtype=bool).reshape(1, 9, 1)
    counted = np.array([1, 1, 1, 1, 0, 1, 1, 1, 1], dtype=bool).reshape(1, 9)
    found = gaps(marked, counted)
    assert found.length[0, :, 0].tolist() == [2, 2, 0, 2, 2, 2, 0, 0, 1]
    assert found.before[0, :, 0].tolist() == [False, False] + [True] * 7
    assert found.after[0, :, 0].tolist() == [True] * 8 + [False]


def test_windows_and_medians() -> None:
    nan = np.nan
    assert window_sum(np.arange(1.0, 6.0)[:, None], 2)[:, 0].tolist() == [1, 3, 5, 7, 9]
    filled = fill_forward(np.array([nan, 1.0, nan, 2.0, nan]))
    np.testing.assert_array_equal(filled, [nan, 1.0, 1.0, 2.0, 2.0])
    np.testing.assert_array_equal(carry(np.array([[nan, 1.0, nan, 2.0, nan]]))[0], [1.0, 1.0, 1.0, 2.0, 2.0])
    values = np.array([[1.0, nan], [3.0, nan], [2.0, nan], [9.0, nan]])
    np.testing.assert_array_equal(upper_median(values), [3.0, nan])
