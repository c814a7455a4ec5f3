"""The invented chain: one seed gives its whole history, its export and the truth behind it.

    python demo_catalog/generate.py [--seed N] [--folder DIR]

The history is lived by individual shoppers (see generator/tastes.py); the truth is worked
out from the same shoppers (see generator/market.py).
"""

from __future__ import annotations

import argparse
import gzip
import sys
from dataclasses import dataclass
from pathlib import Path

import numpy as np

if __package__ in (None, ""):
    sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from demo_catalog.generator import tables
from demo_catalog.generator.history import History, ordinary_market, play
from demo_catalog.generator.lists import CLUSTERS, ItemFacts, all_items
from demo_catalog.generator.market import TrueMarket
from demo_catalog.generator.prices import ItemMoney, draw_money
from demo_catalog.generator.settings import DemoSettings
from demo_catalog.generator.shelves import Stores, draw_stores
from demo_catalog.generator.succession import draw_succession
from demo_catalog.generator.tables import Sheet
from demo_catalog.generator.tastes import draw_households
from demo_catalog.generator.truth import Truth, work_out

__all__ = ["Demo", "DemoSettings", "TrueMarket", "Truth", "build", "write"]

ALL = "ALL"


@dataclass(frozen=True)
class Demo:
    """One invented chain in memory.

    sheets: file name without ending ("sales", "items" ...) -> the exported table.
    careless: (kind, store, week, item) of every slip in the sales file.
    market: what shoppers really do; truth: delistings and offers worked out with it.
    """

    settings: DemoSettings
    items: tuple[ItemFacts, ...]
    stores: Stores
    money: ItemMoney
    history: History
    sheets: dict[str, Sheet]
    careless: list[tuple[str, ...]]
    market: TrueMarket
    truth: Truth


def build(settings: DemoSettings) -> Demo:
    """Everything for one seed, in memory."""
    seeds = np.random.SeedSequence(settings.seed).spawn(6)
    rng = [np.random.Generator(np.random.PCG64(seed)) for seed in seeds]
    items = all_items()
    money = draw_money(items, settings, rng[0])
    stores = draw_stores(settings, rng[1])
    people = draw_households(items, money, stores.cluster, stores.size, settings, rng[2])
    succession = draw_succession(items, len(stores.code), settings, rng[4])
    history = play(items, stores, money, people, succession, settings, rng[3])
    codes = tuple(item.code for item in items)
    lately = slice(settings.weeks - settings.ordinary_weeks, settings.weeks)
    market = ordinary_market(codes, items, stores, money, people, history.listed[-1], lately, settings)
    offered_to = _offered_to(items, rng[4])
    sales, careless = tables.sales_sheet(items, stores, money, history, succession, settings, rng[5])
    sheets = {
        "sales": sales,
        "items": tables.items_sheet(items, money, succession, settings),
        "stores": tables.stores_sheet(stores),
        "shoppers": tables.shoppers_sheet(stores, history, settings),
        "costs": tables.costs_sheet(items, money, succession, settings),
        "ranges": tables.ranges_sheet(items, stores, history, succession, settings),
        "offers": tables.offers_sheet(items, money, offered_to, settings),
        "successors": tables.successors_sheet(items, succession, settings),
    }
    truth = work_out(market, offered_to)
    return Demo(settings, items, stores, money, history, sheets, careless, market, truth)


def _offered_to(items: tuple[ItemFacts, ...], rng: np.random.Generator) -> dict[int, np.ndarray]:
    """Position of each offer -> clusters (C,) it is offered to; two of them not to all."""
    offers = [j for j, item in enumerate(items) if item.launch == 3]
    short = rng.choice(len(offers), size=2, replace=False)
    answer = {}
    for n, j in enumerate(offers):
        clusters = np.ones(len(CLUSTERS), dtype=bool)
        clusters[rng.integers(len(CLUSTERS))] = n not in short
        answer[j] = clusters
    return answer


def write(demo: Demo, folder: Path) -> None:
    """The export into ``folder``, the truth into ``folder``/truth; same demo, same bytes."""
    (folder / "truth").mkdir(parents=True, exist_ok=True)
    for name, text in contents(demo).items():
        data = text.encode("utf-8")
        path = folder / name
        path.write_bytes(gzip.compress(data, 9, mtime=0) if name.endswith(".gz") else data)


def contents(demo: Demo) -> dict[str, str]:
    """File name -> text, before compression."""
    files = {f"{name}.csv": sheet.text() for name, sheet in demo.sheets.items()}
    files["sales.csv.gz"] = files.pop("sales.csv")
    files["truth/transfers.csv"] = _transfers(demo).text()
    files["truth/offers.csv"] = _offers(demo).text()
    files["truth/careless.csv"] = Sheet(("kind", "store_no", "week_commencing", "sku"), demo.careless).text()
    return files


def _transfers(demo: Demo) -> Sheet:
    """One row per cluster, delisted item and receiver; empty receiver: leaves the category."""
    truth, codes = demo.truth, (*demo.market.items, "")
    shares = truth.shares()
    rows = []
    for c, cluster in enumerate((*CLUSTERS, ALL)):
        for i in np.flatnonzero(truth.units[c] > 0.0):
            for k in np.flatnonzero(truth.moved[c, i] > 5e-7):
                gained = f"{truth.moved[c, i, k]:.4f}"
                rows.append((cluster, codes[i], codes[k], gained, f"{shares[c, i, k]:.5f}"))
    return Sheet(("cluster", "delisted", "receiver", "units_per_week", "share"), rows)


def _offers(demo: Demo) -> Sheet:
    """One row per cluster, offer and touched item; empty item: incremental to the category."""
    truth, codes = demo.truth, (*demo.market.items, "")
    rows = []
    for c, cluster in enumerate((*CLUSTERS, ALL)):
        for n, j in enumerate(truth.offer_items):
            for k in np.flatnonzero(np.abs(truth.offers[c, n]) > 5e-7):
                change = truth.offers[c, n, k]
                share = change / truth.offers[c, n, j]
                rows.append((cluster, codes[j], codes[k], f"{change:.4f}", f"{share:.5f}"))
    return Sheet(("cluster", "offer", "item", "units_per_week", "share"), rows)


def main() -> None:
    """Command line: writes one seed's files."""
    parser = argparse.ArgumentParser(
        description="Write the invented chain's files and the truth behind them."
    )
    parser.add_argument("--seed", type=int, default=DemoSettings().seed)
    parser.add_argument("--folder", type=Path, default=Path(__file__).resolve().parent)
    choices = parser.parse_args()
    demo = build(DemoSettings(seed=choices.seed))
    write(demo, choices.folder)
    counts = ", ".join(f"{len(sheet.rows)} {name}" for name, sheet in demo.sheets.items())
    print(f"rows written: {counts}")


if __name__ == "__main__":
    main()
