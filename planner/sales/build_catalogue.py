"""The catalogue: which items, offers and stores the review is about."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import DataError
from planner.base.text import _
from planner.catalogue.items import Catalogue, Item, Store
from planner.sales.checks import Ledger
from planner.sales.codes import CodeIndex, code_index
from planner.sales.item_tables import ItemRow
from planner.sales.matching import Matched, plain

Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class KnownItems:
    """Every code that any table names, with its category.

    rows (n,): records in the order of ``codes``; codes that only the successors table names have none.
    """

    codes: list[str]
    rows: list[ItemRow | None]
    index: CodeIndex


def known_items(items: list[ItemRow], offers: list[ItemRow], successors: Matched | None) -> KnownItems:
    """Items, then offers that are not among them, then old codes that only successors name."""
    codes = [row.item.code for row in items]
    rows: list[ItemRow | None] = list(items)
    place = {code: k for k, code in enumerate(codes)}
    for offer in offers:
        k = place.get(offer.item.code)
        if k is None:
            place[offer.item.code] = len(codes)
            codes.append(offer.item.code)
            rows.append(offer)
        else:
            rows[k] = _merged(rows[k], offer)
    if successors is not None:
        for code in successors.column("old_item").texts():
            if code_index(codes).find(code)[0] < 0:
                codes.append(code)
                rows.append(None)
    return KnownItems(codes, rows, code_index(codes))


def _merged(row: ItemRow | None, offer: ItemRow) -> ItemRow:
    """An offer that the items table names too: the offer's cells where it has any."""
    if row is None:
        return offer
    changes: dict[str, object] = {"is_offer": True, "offered_to": offer.item.offered_to}
    for name in ("description", "segment", "brand", "supplier", "content", "content_unit", "space_cm",
                 "vat_rate", "cost", "price"):  # fmt: skip
        value = getattr(offer.item, name)
        if value:
            changes[name] = value
    return replace(row, item=replace(row.item, **changes))  # type: ignore[arg-type]


def rows_of_other_categories(sales: Matched, known: KnownItems, request_category: str) -> tuple[str, Bools]:
    """(category under review, sales rows (n,) of other categories).

    Raises DataError listing the categories when there are several and none was chosen, or when
    the chosen one does not exist.
    """
    n = len(sales.raw)
    position = known.index.find_all(sales.column("item"))[0]
    names = [row.category if row is not None else "" for row in known.rows]
    by_item = np.array([*names, ""], dtype=object)
    if sales.has("category"):
        column = sales.column("category")
        own = np.array([*column.texts(), ""], dtype=object)[column.codes]
        category = np.where(by_item[position] != "", by_item[position], own)
    elif any(names):
        category = by_item[position]
    else:
        return request_category, np.zeros(n, dtype=bool)
    unknown_item = position < 0
    different = {plain(str(c)): str(c) for c in np.unique(category[category != ""].astype(str))}
    if request_category:
        chosen = different.get(plain(request_category))
        if chosen is None:
            raise DataError(
                _("there are no sales of a category '{name}'; the categories are: {names}.").format(
                    name=request_category, names=", ".join(sorted(different.values()))
                ),
                place=sales.raw.file,
                remedy=_("Choose one with --category."),
            )
    elif len(different) > 1:
        raise DataError(
            _("the sales are of {n} categories: {names}.").format(
                n=len(different), names=", ".join(sorted(different.values()))
            ),
            place=sales.raw.file,
            remedy=_("Choose one with --category."),
        )
    elif not different:
        return "", np.zeros(n, dtype=bool)
    else:
        chosen = next(iter(different.values()))
    texts, inverse = np.unique(category.astype(str), return_inverse=True)
    other = np.array([plain(text) != plain(chosen) for text in texts])[inverse]
    # A code that no table knows and that names no category is an unknown item, not another category's.
    return chosen, other & ~(unknown_item & (category == ""))


def build_catalogue(
    category: str,
    known: KnownItems,
    stores: list[Store],
    sold: Bools,
    ranged: Bools,
    target: Ints,
    ledger: Ledger,
) -> tuple[Catalogue, Ints]:
    """(catalogue, position (n,) of every known item on the item axis, -1 when left out).

    sold, ranged (n,): sold in the history, in a range today (both by newest code).
    Items never sold are offers when they have price and cost, stay when a store lists them, and
    are left out otherwise.
    """
    listed: list[tuple[int, Item]] = []
    offers: list[tuple[int, Item]] = []
    for k, row in enumerate(known.rows):
        if target[k] != k or (row is None and not sold[k]):
            continue
        if row is not None and row.category and category and plain(row.category) != plain(category):
            continue
        item = row.item if row is not None else Item(known.codes[k])
        place = (row.file, row.row, item.code) if row is not None else (ledger.raw.file, 0, item.code)
        if sold[k]:
            if item.is_offer:
                ledger.note_other("offer_already_sold", [place])
            if not item.segment:
                ledger.note_other("item_without_segment", [place])
            segment = item.segment or _("without segment")
            listed.append((k, replace(item, is_offer=False, offered_to=(), segment=segment)))
        elif item.is_offer or (item.price is not None and item.cost is not None and not ranged[k]):
            if not item.is_offer:
                ledger.note_other("never_sold", [place])
            if item.segment:
                offers.append((k, replace(item, is_offer=True)))
            else:
                ledger.note_other("item_without_segment", [place])
        elif ranged[k] and item.segment:
            ledger.note_other("never_sold", [place])
            listed.append((k, item))
        else:
            ledger.note_other("never_sold", [place])
    if not listed:
        raise DataError(
            _("no sales row could be used; see the reasons: {reasons}.").format(
                reasons=", ".join(
                    f"{check.title} ({check.rows})" for check in ledger.checks() if check.set_aside
                )
            ),
            place=ledger.raw.file,
            remedy=_("Check that item and store codes agree between the files."),
        )
    position = np.full(len(known.codes), -1, dtype=np.int64)
    chosen = [*listed, *offers]
    position[[k for k, _item in chosen]] = np.arange(len(chosen))
    catalogue = Catalogue(category, tuple(item for _k, item in chosen), tuple(stores))
    alone = [name for g, name in enumerate(catalogue.segments) if catalogue.segment_of_item().count(g) == 1]
    ledger.note_other("segment_with_one_item", [(ledger.raw.file, 0, name) for name in alone])
    return catalogue, position


def with_known_clusters(items: tuple[Item, ...], catalogue: Catalogue, notes: list[str]) -> tuple[Item, ...]:
    """Offers' clusters under the catalogue's names; names that are no cluster are said and dropped."""
    names = {plain(cluster): cluster for cluster in catalogue.clusters}
    result = []
    for item in items:
        known = tuple(names[plain(name)] for name in item.offered_to if plain(name) in names)
        unknown = [name for name in item.offered_to if plain(name) not in names]
        if unknown:
            notes.append(
                _("Offer {item} names {unknown}, which is none of the clusters {clusters}.").format(
                    item=item.code, unknown=", ".join(unknown), clusters=", ".join(catalogue.clusters)
                )
            )
        # An offer for nobody we know stays closed rather than open to all.
        result.append(replace(item, offered_to=known or item.offered_to))
    return tuple(result)
