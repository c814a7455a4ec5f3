"""The chain's export: tables under the names its data team uses, careless spots included.

Sales hold one row per store, week and item for which something sold or the shelf was
empty on some day; a listed item without a row was on the shelf and did not sell.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import timedelta

import numpy as np
from numpy.typing import NDArray

from demo_catalog.generator.history import History
from demo_catalog.generator.lists import (
    BRANDS,
    CATEGORY,
    CLUSTERS,
    FLAVOURS,
    SEGMENTS,
    SIZES,
    ItemFacts,
)
from demo_catalog.generator.prices import ItemMoney
from demo_catalog.generator.settings import DemoSettings
from demo_catalog.generator.shelves import Stores
from demo_catalog.generator.succession import Succession

Row = tuple[str, ...]


@dataclass(frozen=True)
class Sheet:
    """One file: header and rows, every cell as it is written."""

    columns: Row
    rows: Sequence[Row]

    def text(self) -> str:
        """As comma-separated text with a final line break."""
        lines = [",".join(self.columns)]
        lines += [",".join(_quoted(cell) for cell in row) for row in self.rows]
        return "\n".join(lines) + "\n"


def _quoted(cell: str) -> str:
    return f'"{cell}"' if "," in cell else cell


def gtin(code: str, brand: int) -> str:
    """A GTIN-13 in the range GS1 leaves to the inside of a company (20-29), with its check digit."""
    body = f"2{brand:02d}4{int(code):08d}"
    total = sum(int(digit) * (3 if k % 2 else 1) for k, digit in enumerate(body))
    return f"{body}{(10 - total % 10) % 10}"


_ITEM_COLUMNS = (
    "sku",
    "gtin",
    "description",
    "category",
    "segment",
    "brand",
    "supplier",
    "own_label",
    "net_content",
    "content_unit",
    "servings",
    "pack_type",
    "flavour",
    "caffeine",
    "organic",
    "vat_rate",
    "unit_cost",
    "width_cm",
    "facings",
    "min_facings",
    "case_size",
)


def _item_cells(item: ItemFacts, j: int, money: ItemMoney, cost: float) -> Row:
    brand = BRANDS[item.brand]
    return (
        item.code,
        gtin(item.code, item.brand),
        f"{brand.name} {item.name} {item.bags}",
        CATEGORY,
        SEGMENTS[item.segment],
        brand.name,
        brand.supplier,
        "Y" if brand.own_label else "N",
        f"{item.grams:g}",
        "g",
        str(item.bags),
        item.pack,
        FLAVOURS[item.flavour],
        "Y" if item.caffeine else "N",
        "Y" if item.organic else "N",
        f"{money.vat[j]:.2f}",
        f"{cost:.2f}",
        f"{money.width_cm[j]:.1f}",
        str(money.facings[j]),
        str(money.min_facings[j]),
        str(money.case_size[j]),
    )


def items_sheet(
    items: tuple[ItemFacts, ...], money: ItemMoney, succession: Succession, settings: DemoSettings
) -> Sheet:
    """Every item ever sold, the old code included; costs as of the last review."""
    cost = money.cost[settings.review_weeks[1]]
    rows = []
    for j, item in enumerate(items):
        if item.launch == 3:
            continue
        rows.append((*_item_cells(item, j, money, cost[j]), "Y" if money.keep[j] else ""))
        if j == succession.item:
            grams = item.grams / item.bags * succession.old_bags
            old = replace(item, code=succession.old_code, bags=succession.old_bags, grams=grams)
            rows.append((*_item_cells(old, j, money, money.cost[0, j]), ""))
    return Sheet((*_ITEM_COLUMNS, "keep"), sorted(rows))


def offers_sheet(
    items: tuple[ItemFacts, ...],
    money: ItemMoney,
    offered_to: dict[int, NDArray[np.bool_]],
    settings: DemoSettings,
) -> Sheet:
    """New items that suppliers propose: the items' columns, price, clusters, earliest week."""
    rows = []
    for n, (j, clusters) in enumerate(offered_to.items()):
        names = [CLUSTERS[c] for c in np.flatnonzero(clusters)]
        earliest = settings.monday(settings.weeks + 3 + 2 * (n % 3)).isoformat()
        cells = _item_cells(items[j], j, money, money.cost[-1, j])
        rows.append((*cells, f"{money.regular[-1, 0, j]:.2f}", ";".join(names), earliest))
    return Sheet((*_ITEM_COLUMNS, "price", "clusters", "earliest_week"), rows)


def stores_sheet(stores: Stores) -> Sheet:
    """Stores with cluster, size and metres."""
    rows = [
        (code, f"{town}", CLUSTERS[stores.cluster[s]], SIZES[stores.size[s]], f"{stores.space_cm[s]:g}")
        for s, (code, town) in enumerate(zip(stores.code, stores.town, strict=True))
    ]
    return Sheet(("store_no", "store_name", "cluster", "size", "shelf_cm"), rows)


def shoppers_sheet(stores: Stores, history: History, settings: DemoSettings) -> Sheet:
    """Everybody who came in, by store and week."""
    rows = [
        (code, settings.monday(w).isoformat(), str(history.visitors[w, s]))
        for s, code in enumerate(stores.code)
        for w in range(settings.weeks)
    ]
    return Sheet(("store_no", "week_commencing", "footfall"), rows)


def costs_sheet(
    items: tuple[ItemFacts, ...], money: ItemMoney, succession: Succession, settings: DemoSettings
) -> Sheet:
    """Each cost with the first week it holds."""
    before = (settings.first_week - timedelta(weeks=9)).isoformat()
    rows = []
    for j, item in enumerate(items):
        if item.launch == 3:
            continue
        codes = [item.code, succession.old_code] if j == succession.item else [item.code]
        cost = money.cost[:, j]
        steps = np.flatnonzero(np.diff(cost) != 0.0) + 1
        for code in codes:
            rows.append((code, f"{cost[0]:.2f}", before))
            rows += [(code, f"{cost[w]:.2f}", settings.monday(int(w)).isoformat()) for w in steps]
    return Sheet(("sku", "unit_cost", "from_week"), sorted(rows, key=lambda row: (row[0], row[2])))


def ranges_sheet(
    items: tuple[ItemFacts, ...],
    stores: Stores,
    history: History,
    succession: Succession,
    settings: DemoSettings,
) -> Sheet:
    """Runs of weeks in which a store carried an item, by code; blank last week: still listed."""
    rows = []
    last = settings.weeks - 1
    for s, store in enumerate(stores.code):
        for j in np.flatnonzero(history.listed[:, s].any(axis=0)):
            edges = np.diff(np.r_[False, history.listed[:, s, j], False].astype(np.int8))
            starts, ends = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1) - 1
            for start, end in zip(starts, ends, strict=True):
                cuts = [int(start)]
                if j == succession.item and start < succession.week[s] <= end:
                    cuts.append(int(succession.week[s]))
                for k, cut in enumerate(cuts):
                    stop = cuts[k + 1] - 1 if k + 1 < len(cuts) else end
                    earlier = 26 * (1 + int(j) % 3) if cut == 0 else 0
                    opened = settings.monday(int(cut)) - timedelta(weeks=earlier)
                    closed = "" if stop == last else settings.monday(int(stop)).isoformat()
                    code = succession.code(items, int(cut), s, int(j))
                    rows.append((store, code, opened.isoformat(), closed))
    return Sheet(("store_no", "sku", "first_week", "last_week"), sorted(rows))


def successors_sheet(items: tuple[ItemFacts, ...], succession: Succession, settings: DemoSettings) -> Sheet:
    """The one resized pack."""
    new = items[succession.item]
    # How many old units one new unit holds.
    factor = f"{new.bags / succession.old_bags:g}"
    date = settings.monday(int(succession.week.min())).isoformat()
    return Sheet(
        ("old_sku", "new_sku", "changeover", "pack_factor"), [(succession.old_code, new.code, date, factor)]
    )


_SALES_COLUMNS = (
    "store_no",
    "week_commencing",
    "sku",
    "qty",
    "turnover",
    "on_promo",
    "shelf_price",
    "days_oos",
)


def sales_sheet(
    items: tuple[ItemFacts, ...],
    stores: Stores,
    money: ItemMoney,
    history: History,
    succession: Succession,
    settings: DemoSettings,
    rng: np.random.Generator,
) -> tuple[Sheet, list[Row]]:
    """The sales file, and the careless rows in it as (kind, store, week, item)."""
    cells = np.argwhere(((history.units > 0) | (history.days_out > 0)).transpose(1, 0, 2))
    regular = np.rint(money.regular * 100).astype(np.int64)
    mondays = [settings.monday(w).isoformat() for w in range(settings.weeks)]
    rows: list[Row] = []
    for s, w, j in cells.tolist():
        full = int(regular[w, stores.cluster[s], j])
        cut = history.depth[w, s, j]
        price = round(full * (1.0 - cut))
        sold = int(history.units[w, s, j])
        code = succession.code(items, w, s, j)
        rows.append(
            (
                stores.code[s],
                mondays[w],
                code,
                str(sold),
                _money(sold * price),
                "1" if cut else "0",
                _money(full),
                str(history.days_out[w, s, j]),
            )
        )
    return _careless(rows, rng)


def _money(cents: int) -> str:
    sign = "-" if cents < 0 else ""
    return f"{sign}{abs(cents) // 100}.{abs(cents) % 100:02d}"


def _cents(text: str) -> int:
    return int(text.replace(".", ""))


def _careless(rows: list[Row], rng: np.random.Generator) -> tuple[Sheet, list[Row]]:
    """A real export's slips, few: see each kind below; a total line closes the file."""
    seen: list[Row] = []
    sold = [k for k, row in enumerate(rows) if int(row[3]) > 1]
    picked = [sold[k] for k in rng.choice(len(sold), size=32, replace=False)]
    extra: dict[int, list[Row]] = {}

    def note(kind: str, row: Row) -> None:
        seen.append((kind, row[0], row[1], row[2].strip()))

    for k in picked[:12]:
        extra[k] = [rows[k]]
        note("duplicate", rows[k])
    for k in picked[12:21]:
        store, week, code, qty, turnover, promo, price, days = rows[k]
        back = _money(-(_cents(turnover) // int(qty)))
        extra[k] = [(store, week, code, "-1", back, promo, price, days)]
        note("return", rows[k])
    for k in picked[21:24]:
        store, week, code, *_ = rows[k]
        extra[k] = [(store, week, "0099218", "2", "4.98", "0", "2.49", "0")]
        note("unknown item", extra[k][0])
    for k in picked[24:28]:
        rows[k] = (*rows[k][:2], f"{rows[k][2]} ", *rows[k][3:])
        note("blank after the code", rows[k])
    for k in picked[28:31]:
        rows[k] = (*rows[k][:4], "0.00", *rows[k][5:])
        note("no turnover", rows[k])
    k = picked[31]
    rows[k] = (*rows[k][:4], _money(100 * _cents(rows[k][4])), *rows[k][5:])
    note("turnover a hundredfold", rows[k])
    out = [line for k, row in enumerate(rows) for line in (row, *extra.get(k, []))]
    units, turnover = sum(int(row[3]) for row in out), sum(_cents(row[4]) for row in out)
    out.append(("Total", "", "", str(units), _money(turnover), "", "", ""))
    seen.append(("total line", "Total", "", ""))
    return Sheet(_SALES_COLUMNS, out), sorted(seen)
