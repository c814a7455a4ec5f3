"""The committed files: made by the generator, of the promised size, consistent among themselves."""

from __future__ import annotations

import csv
import gzip
import io
from collections import Counter, defaultdict
from dataclasses import replace
from datetime import date, timedelta
from pathlib import Path

import numpy as np
import pytest

from demo_catalog.generate import Demo, build, contents, write

FOLDER = Path(__file__).resolve().parents[2] / "demo_catalog"
NAMES = ("items", "stores", "shoppers", "costs", "ranges", "offers", "successors")


def committed(name: str) -> str:
    """A committed file's text, unpacked."""
    data = (FOLDER / name).read_bytes()
    return (gzip.decompress(data) if name.endswith(".gz") else data).decode("utf-8")


def rows_of(name: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(committed(name))))


@pytest.fixture(scope="module")
def sales() -> list[dict[str, str]]:
    """Rows of the sales file without the closing total."""
    rows = rows_of("sales.csv.gz")
    assert rows[-1]["store_no"] == "Total"
    return rows[:-1]


def test_the_committed_files_are_what_the_generator_writes(demo: Demo) -> None:
    # Unpacked, since the same text may be packed differently by another zlib.
    for name, text in contents(demo).items():
        assert committed(name) == text, name


def test_same_seed_same_bytes_other_seed_others(small: Demo, tmp_path: Path) -> None:
    write(small, tmp_path / "a")
    write(build(small.settings), tmp_path / "b")
    files = sorted(p.relative_to(tmp_path / "a") for p in (tmp_path / "a").rglob("*") if p.is_file())
    assert len(files) == len(NAMES) + 1 + 3
    for name in files:
        assert (tmp_path / "a" / name).read_bytes() == (tmp_path / "b" / name).read_bytes(), name
    other = build(replace(small.settings, seed=small.settings.seed + 1))
    assert contents(other)["stores.csv"] != contents(small)["stores.csv"]


def test_size_is_under_four_megabytes() -> None:
    size = sum(p.stat().st_size for p in FOLDER.rglob("*") if p.suffix in (".csv", ".gz"))
    assert size < 4_000_000


def test_counts_are_those_of_a_real_category() -> None:
    items, stores, offers = rows_of("items.csv"), rows_of("stores.csv"), rows_of("offers.csv")
    weeks = {row["week_commencing"] for row in rows_of("shoppers.csv")}
    assert 66 <= len(items) <= 76
    assert 6 <= len({row["segment"] for row in items}) <= 8
    assert 12 <= len({row["brand"] for row in items}) <= 15
    assert 5 <= len({row["supplier"] for row in items}) <= 6
    assert {row["own_label"] for row in items} == {"Y", "N"}
    assert len(stores) == 36
    assert len({row["cluster"] for row in stores}) == 3
    assert len(weeks) == 78
    assert all(date.fromisoformat(week).isoweekday() == 1 for week in weeks)
    assert max(weeks).startswith("2026")
    assert len(offers) == 6
    assert len(rows_of("successors.csv")) == 1
    assert sum(row["keep"] == "Y" for row in items) == 2


def test_codes_are_unique_and_some_start_with_zero() -> None:
    codes = [row["sku"] for row in rows_of("items.csv") + rows_of("offers.csv")]
    assert len(codes) == len(set(codes))
    assert any(code.startswith("0") for code in codes)
    assert any(row["store_no"].startswith("0") for row in rows_of("stores.csv"))


def test_gtins_are_internal_numbers_with_their_check_digit() -> None:
    gtins = [row["gtin"] for row in rows_of("items.csv") + rows_of("offers.csv")]
    assert len(gtins) == len(set(gtins))
    for gtin in gtins:
        assert len(gtin) == 13
        assert gtin[0] == "2"
        weighted = sum(int(d) * (1 if k % 2 == 0 else 3) for k, d in enumerate(gtin))
        assert weighted % 10 == 0, gtin


def test_nothing_sells_outside_its_range(sales: list[dict[str, str]]) -> None:
    runs = defaultdict(list)
    for row in rows_of("ranges.csv"):
        runs[row["store_no"], row["sku"]].append((row["first_week"], row["last_week"] or "9999"))
    known = {row["sku"] for row in rows_of("items.csv")}
    for row in sales:
        code = row["sku"].strip()
        if code in known:
            week = row["week_commencing"]
            assert any(a <= week <= b for a, b in runs[row["store_no"], code]), row


def test_ranges_name_known_codes_and_do_not_overlap() -> None:
    stores = {row["store_no"] for row in rows_of("stores.csv")}
    known = {row["sku"] for row in rows_of("items.csv")}
    last: dict[tuple[str, str], str] = {}
    for row in rows_of("ranges.csv"):
        key = (row["store_no"], row["sku"])
        assert key[0] in stores
        assert key[1] in known
        assert row["first_week"] > last.get(key, "")
        assert not row["last_week"] or row["last_week"] >= row["first_week"]
        last[key] = row["last_week"] or "9999"


def test_the_new_code_follows_the_old_one_without_a_gap() -> None:
    pair = rows_of("successors.csv")[0]
    ends = {r["store_no"]: r["last_week"] for r in rows_of("ranges.csv") if r["sku"] == pair["old_sku"]}
    starts = {r["store_no"]: r["first_week"] for r in rows_of("ranges.csv") if r["sku"] == pair["new_sku"]}
    changed = [
        s
        for s in ends
        if s in starts and date.fromisoformat(ends[s]) + timedelta(7) == date.fromisoformat(starts[s])
    ]
    assert len(changed) >= 5
    assert min(starts[s] for s in changed) >= pair["changeover"]


def test_the_careless_rows_are_there_and_few(demo: Demo, sales: list[dict[str, str]]) -> None:
    kinds = Counter(row[0] for row in demo.careless)
    assert sum(kinds.values()) < 50
    known = {row["sku"] for row in rows_of("items.csv")}
    lines = Counter(tuple(row.values()) for row in sales)
    assert sum(n - 1 for n in lines.values()) == kinds["duplicate"]
    assert sum(int(row["qty"]) < 0 for row in sales) == kinds["return"]
    assert sum(row["sku"].strip() not in known for row in sales) == kinds["unknown item"]
    assert sum(row["sku"] != row["sku"].strip() for row in sales) == kinds["blank after the code"]
    free = [row for row in sales if int(row["qty"]) > 0 and row["turnover"] == "0.00"]
    assert len(free) == kinds["no turnover"]


def test_the_closing_total_is_the_sum_of_the_rows(sales: list[dict[str, str]]) -> None:
    total = rows_of("sales.csv.gz")[-1]
    assert int(total["qty"]) == sum(int(row["qty"]) for row in sales)
    cents = sum(round(float(row["turnover"]) * 100) for row in sales)
    assert round(float(total["turnover"]) * 100) == cents


def test_many_items_are_partly_listed_and_each_review_moves_a_dozen(demo: Demo) -> None:
    cluster = demo.stores.cluster
    part = np.stack([demo.market.today[cluster == c].mean(axis=0) for c in range(3)])
    assert 0.3 < ((part > 0) & (part < 1)).sum() / (part > 0).sum() < 0.8
    moves = demo.history.listed[1:] != demo.history.listed[:-1]
    for first in demo.settings.review_weeks:
        stores_moved = moves[first - 1 : first + 7].sum(axis=(0, 1))
        assert 8 <= (stores_moved >= 5).sum() <= 20
        assert stores_moved.max() <= 2 * len(cluster)


def test_every_range_fits_its_shelf(demo: Demo) -> None:
    for week in range(demo.settings.weeks):
        used = demo.history.listed[week] @ demo.market.space_cm
        assert (used <= demo.stores.space_in(week) + 1e-9).all()


def test_few_visitors_buy(demo: Demo) -> None:
    share = demo.history.units.sum(axis=2) / demo.history.visitors
    assert 0.01 < share.mean() < 0.15
    assert share.max() < 0.3
