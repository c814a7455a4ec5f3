"""The demo catalogue's files, loaded and recomputed from the raw text by plain counting."""

from __future__ import annotations

import csv
import gzip
from collections import Counter, defaultdict
from datetime import date, timedelta
from decimal import Decimal

import numpy as np
import pytest

from planner.base.paths import demo_folder
from planner.sales.load import load, request_from_folder
from planner.sales.report import LoadedData
from tests.sales.files import check, reconciles

Raw = dict[str, str]


def _read(name: str) -> list[Raw]:
    path = demo_folder() / name
    data = gzip.decompress(path.read_bytes()) if name.endswith(".gz") else path.read_bytes()
    rows = csv.DictReader(data.decode("utf-8").splitlines())
    return [{key: value.strip() for key, value in row.items()} for row in rows]


@pytest.fixture(scope="module")
def demo() -> LoadedData:
    return load(request_from_folder(demo_folder()))


@pytest.fixture(scope="module")
def sales() -> list[Raw]:
    return _read("sales.csv.gz")


@pytest.fixture(scope="module")
def usable(sales: list[Raw]) -> list[Raw]:
    """Rows that name a known item, once each, with money for their units, at a sane price."""
    known = {row["sku"] for row in _read("items.csv")}
    seen: set[tuple[str, ...]] = set()
    kept = []
    for row in sales:
        cells = tuple(row.values())
        units, money = int(row["qty"]), Decimal(row["turnover"])
        sane = units == 0 or (money != 0 and money / units <= 5 * Decimal(row["shelf_price"] or 0))
        if row["sku"] in known and cells not in seen and sane:
            kept.append(row)
        seen.add(cells)
    return kept


def test_careless_rows_are_found_as_planted(demo: LoadedData) -> None:
    planted = Counter(row["kind"] for row in _read("truth/careless.csv"))
    found = {
        "blank after the code": "similar_code",
        "duplicate": "duplicate_row",
        "no turnover": "zero_price",
        "return": "return_netted",
        "total line": "total_line",
        "turnover a hundredfold": "absurd_price",
        "unknown item": "unknown_item",
    }
    assert set(planted) == set(found)
    for kind, code in found.items():
        assert check(demo, code)[0] == planted[kind], kind


def test_money_to_the_penny(demo: LoadedData, sales: list[Raw], usable: list[Raw]) -> None:
    assert demo.report.money_read == sum(Decimal(row["turnover"]) for row in sales)
    assert demo.report.money_used == sum(Decimal(row["turnover"]) for row in usable)
    assert demo.report.rows_used == len(usable)
    assert reconciles(demo)


def test_units_per_cell(demo: LoadedData, usable: list[Raw]) -> None:
    (change,) = _read("successors.csv")
    expected: dict[tuple[str, date, str], float] = defaultdict(float)
    for row in usable:
        units, item = float(row["qty"]), row["sku"]
        if item == change["old_sku"]:
            units, item = units / float(change["pack_factor"]), change["new_sku"]
        expected[row["store_no"], date.fromisoformat(row["week_commencing"]), item] += units
    panel, catalogue = demo.panel, demo.catalogue
    found = {
        (
            catalogue.stores[panel.store_index[t]].code,
            panel.weeks[panel.week_index[t]],
            catalogue.items[j].code,
        ): (panel.units[t, j])
        for t, j in zip(*np.nonzero(panel.units), strict=True)
    }
    assert found == pytest.approx({key: units for key, units in expected.items() if units > 0})


def test_ranges_today_and_events(demo: LoadedData) -> None:
    (change,) = _read("successors.csv")
    panel, catalogue = demo.panel, demo.catalogue
    first, last = panel.weeks[0], panel.weeks[-1]
    weeks: dict[tuple[str, str], set[date]] = defaultdict(set)
    for row in _read("ranges.csv"):
        item = change["new_sku"] if row["sku"] == change["old_sku"] else row["sku"]
        start = max(date.fromisoformat(row["first_week"]), first)
        end = min(date.fromisoformat(row["last_week"]), last) if row["last_week"] else last
        weeks[row["store_no"], item] |= {
            start + timedelta(days=7 * k) for k in range((end - start).days // 7 + 1)
        }
    stores, items = catalogue.store_index(), catalogue.item_index()
    today = np.zeros_like(demo.base.today)
    events = set()
    for (store, item), listed in weeks.items():
        today[stores[store], items[item]] = last in listed
        events |= {(store, item, w, "listed") for w in listed if w > first and w - timedelta(7) not in listed}
        events |= {
            (store, item, w + timedelta(7), "delisted")
            for w in listed
            if w < last and w + timedelta(7) not in listed
        }
    assert (demo.base.today == today).all()
    found = {(e.store, e.item, e.week, e.kind) for e in demo.report.events}
    # A successor that starts a few weeks after its old code ended is one range without an event.
    joined = {event for event in events - found if event[1] == change["new_sku"]}
    assert found == events - joined
    assert len(found) > 300


def test_base_week(demo: LoadedData, usable: list[Raw]) -> None:
    base, catalogue = demo.base, demo.catalogue
    store, item = catalogue.stores[0].code, catalogue.items[0].code
    cell = [row for row in usable if (row["store_no"], row["sku"]) == (store, item)]
    window = [row for row in cell if date.fromisoformat(row["week_commencing"]) >= base.first_week]
    assert base.weeks == 13
    assert base.units[0, 0] == pytest.approx(sum(int(row["qty"]) for row in window) / 13)
    cluster = catalogue.cluster_of_store()[0]
    assert base.price[cluster, 0] == pytest.approx(float(cell[-1]["shelf_price"]), rel=0.03)
    items = {row["sku"]: row for row in _read("items.csv")}
    wide = items[item]
    facings = max(int(wide["facings"] or 1), int(wide["min_facings"] or 1))
    assert base.space_cm[0] == pytest.approx(float(wide["width_cm"]) * facings)
    costs = [row for row in _read("costs.csv") if row["sku"] == item]
    assert base.cost[0] == pytest.approx(float(max(costs, key=lambda row: row["from_week"])["unit_cost"]))
    limits = {row["store_no"]: float(row["shelf_cm"]) for row in _read("stores.csv")}
    use = base.today @ base.space_cm
    assert base.space_limit == pytest.approx(np.maximum([limits[s.code] for s in catalogue.stores], use))
    assert base.space_known
    assert [i.code for i in catalogue.items if i.is_offer] == [row["sku"] for row in _read("offers.csv")]
    assert (base.margin[:, base.today.any(axis=0)] > 0.0).all()
