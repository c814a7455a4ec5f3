"""A small invented category as files: 10 items of three segments, 8 stores in two clusters, 30 weeks."""

from __future__ import annotations

import csv
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import numpy as np

WEEKS = 30
FIRST = date(2025, 9, 1)
SEGMENTS = ("Plain soup", "Fish soup", "Bean soup")
# code, segment, brand, own label, price, cost, width; codes with leading zeros on purpose.
ITEMS = (
    ("0011", 0, "Österbeck", "Y", 1.20, 0.70, 9.0),
    ("0012", 0, "Marlind", "N", 1.90, 1.10, 10.0),
    ("0013", 0, "Marlind", "N", 2.10, 1.30, 8.0),
    ("0014", 0, "Tverrhus", "N", 2.40, 1.40, 9.0),
    ("0021", 1, "Österbeck", "Y", 2.20, 1.30, 9.0),
    ("0022", 1, "Tverrhus", "N", 3.10, 1.90, 11.0),
    ("0023", 1, "Marlind", "N", 2.80, 1.80, 9.0),
    ("0031", 2, "Österbeck", "Y", 1.50, 0.80, 9.0),
    ("0032", 2, "Quellin", "N", 2.30, 1.30, 10.0),
    ("0033", 2, "Quellin", "N", 2.60, 1.70, 12.0),
)
OFFERS = (("0090", 1, "Quellin", "N", 2.90, 1.60, 9.0, "North"),)
STORES = tuple((f"{100 + s}", "North" if s < 4 else "South", 95.0 + 2 * (s % 4)) for s in range(8))
TASTES = np.array([1.2, 0.9, 0.7, 0.6, 0.8, 0.5, 0.6, 0.9, 0.7, 0.4])


def _listed() -> np.ndarray:
    """(S, J, W): range of every store and week; one item partly listed, one delisted, one listed late."""
    listed = np.ones((len(STORES), len(ITEMS), WEEKS), dtype=bool)
    listed[::2, 3] = False
    listed[:4, 6, 14:] = False
    listed[4:, 9, :10] = False
    for s in range(len(STORES)):
        listed[s, (s * 3 + 1) % len(ITEMS), 6 + s : 12 + s] = False
    return listed


def _write(path: Path, header: list[str], rows: list[list[object]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(header)
        writer.writerows(rows)


def _sales(listed: np.ndarray, shoppers: np.ndarray, price: np.ndarray, seed: int) -> list[list[object]]:
    """Nested shares with Poisson noise."""
    rng = np.random.default_rng(seed)
    segment = np.array([item[1] for item in ITEMS])
    rows: list[list[object]] = []
    for w in range(WEEKS):
        utility = TASTES - 0.35 * price[:, w]
        for s in range(len(STORES)):
            attraction = np.exp(utility / 0.5) * listed[s, :, w]
            total = np.bincount(segment, attraction, minlength=3)
            level = np.where(total > 0.0, np.sqrt(np.where(total > 0.0, total, 1.0)), 0.0)
            odds = 0.02 * level.sum() ** 0.6
            category = shoppers[s, w] * odds / (1.0 + odds)
            share = level[segment] / level.sum() * attraction / np.where(total > 0.0, total, 1.0)[segment]
            units = rng.poisson(category * share)
            for j in np.flatnonzero(units):
                money = round(float(units[j] * price[j, w]), 2)
                week = FIRST + timedelta(weeks=w)
                rows.append([STORES[s][0], week.isoformat(), ITEMS[j][0], int(units[j]), f"{money:.2f}"])
    return rows


def write_folder(folder: Path, seed: int = 1, costs: bool = True) -> Path:
    """Write the files into ``folder``; costs: with the column of unit costs."""
    folder.mkdir(parents=True, exist_ok=True)
    rng = np.random.default_rng(seed + 1000)
    listed = _listed()
    shoppers = rng.integers(2600, 3400, (len(STORES), WEEKS)).astype(float)
    price = np.array([item[4] for item in ITEMS])[:, None] * np.ones(WEEKS)
    for j in range(len(ITEMS)):
        price[j, 8 + j : 20 + j] = np.round(price[j, 0] * 1.08, 2)
    sales = _sales(listed, shoppers, price, seed)
    _write(folder / "sales.csv", ["store", "week", "item", "units", "sales_value"], sales)
    header = [
        "item",
        "description",
        "segment",
        "brand",
        "supplier",
        "own_label",
        "price",
        "width_cm",
        "vat_rate",
    ]

    def cells(item: tuple[Any, ...]) -> list[object]:
        code, g, brand, own, shelf_price, cost, width = item[:7]
        row = [code, f"{brand} {SEGMENTS[g]} {code}", SEGMENTS[g], brand, f"{brand} Foods", own]
        return [*row, shelf_price, width, "0.10", *([cost] if costs else [])]

    if costs:
        header = [*header, "unit_cost"]
    without = header.index("price")
    _write(
        folder / "items.csv",
        header[:without] + header[without + 1 :],
        [row[:without] + row[without + 1 :] for row in map(cells, ITEMS)],
    )
    _write(folder / "offers.csv", [*header, "clusters"], [[*cells(offer), offer[7]] for offer in OFFERS])
    _write(folder / "stores.csv", ["store", "cluster", "shelf_cm"], [list(store) for store in STORES])
    _write(
        folder / "shoppers.csv",
        ["store", "week", "shoppers"],
        [
            [STORES[s][0], (FIRST + timedelta(weeks=w)).isoformat(), int(shoppers[s, w])]
            for s in range(len(STORES))
            for w in range(WEEKS)
        ],
    )
    _write(folder / "ranges.csv", ["store", "item", "first_week", "last_week"], _ranges(listed))
    return folder


def _ranges(listed: np.ndarray) -> list[list[object]]:
    """Runs of weeks on the list; open at the end when still listed."""
    rows: list[list[object]] = []
    for s, j in np.ndindex(listed.shape[:2]):
        edges = np.flatnonzero(np.diff(np.concatenate([[0], listed[s, j].astype(int), [0]])))
        for first, after in zip(edges[::2], edges[1::2], strict=True):
            last = "" if after == WEEKS else (FIRST + timedelta(weeks=int(after) - 1)).isoformat()
            start = (FIRST + timedelta(weeks=int(first))).isoformat()
            rows.append([STORES[s][0], ITEMS[j][0], start, last])
    return rows
