"""The items, offers and stores tables as records."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import DataError
from planner.base.text import _
from planner.catalogue.items import Item, Store
from planner.sales.checks import Ledger
from planner.sales.columns import TextColumn, column_of
from planner.sales.gtin import LENGTHS, is_valid
from planner.sales.matching import Matched, plain
from planner.sales.money import decimal_marks, parse_number, read_flags, read_numbers
from planner.sales.synonyms import CENTIMETRES

Floats = NDArray[np.float64]

_NUMBERS = ("cost", "price", "space_cm", "width_cm", "facings", "min_facings")
_SHARES = ("vat_rate", "margin_rate")
_CONTENT = re.compile(r"^(?:(\d+)\s*[xX*]\s*)?(\d+(?:[.,]\d+)?)\s*([A-Za-z]*)\.?$")
_UNITS = {"ml": ("l", 0.001), "cl": ("l", 0.01), "dl": ("l", 0.1), "l": ("l", 1.0), "lt": ("l", 1.0),
          "ltr": ("l", 1.0), "g": ("kg", 0.001), "gr": ("kg", 0.001), "kg": ("kg", 1.0)}  # fmt: skip


@dataclass(frozen=True)
class ItemRow:
    """One row of items or offers: the record, its category, margin rate (None: unknown) and place."""

    item: Item
    category: str
    margin_rate: float | None
    file: str
    row: int


def _space_factor(header: str) -> float:
    words = [w for w in re.split(r"[\W_]+", header.casefold()) if w]
    return CENTIMETRES.get(words[-1], 1.0) if words else 1.0


def _lengths(table: Matched, name: str, marks: dict[str, str]) -> Floats:
    """A length column in centimetres; 0 where blank or unreadable."""
    if not table.has(name):
        return np.zeros(len(table.raw))
    values = read_numbers(table.column(name), marks[name]).values
    return np.maximum(np.nan_to_num(values), 0.0) * _space_factor(table.names[name])


def _report_unreadable(table: Matched, names: tuple[str, ...], marks: dict[str, str], ledger: Ledger) -> None:
    for name in names:
        if not table.has(name):
            continue
        rows = np.flatnonzero(read_numbers(table.column(name), marks[name]).bad)
        cells = table.column(name).cells(rows)
        ledger.note_other(
            "unreadable_cell",
            [
                (table.raw.file, int(table.raw.rows[row]), f"{table.names[name]}={cell}")
                for row, cell in zip(rows, cells, strict=True)
            ],
        )


def rates(column: TextColumn, mark: str) -> Floats:
    """Rates (n,): 20 %, 20 and 0.2 all mean 0.2; NaN where blank or unreadable."""
    texts = [text.replace("%", "").strip() for text in column.texts()]
    percent = np.array(["%" in text for text in column.texts()] + [False])[column.codes]
    short = column_of(texts)
    codes = np.append(short.codes, np.int32(-1))[column.codes]
    values = read_numbers(TextColumn(codes, short.values), mark).values
    known = values[np.isfinite(values)]
    # One column is written one way: a value of 1 or more makes all of it per cent.
    whole = percent | bool(known.size and np.abs(known).max() >= 1.0)
    return np.where(whole, values / 100.0, values)


def segment_texts(table: Matched, segment_by: tuple[str, ...]) -> list[str]:
    """The segment (n,) of every row: chosen columns joined by " / ", or the segment column."""
    rows = np.arange(len(table.raw))
    if not segment_by:
        return table.column("segment").cells(rows) if table.has("segment") else [""] * len(rows)
    parts = [table.raw.columns[_chosen(table, name)].cells(rows) for name in segment_by]
    return [" / ".join(cells) if any(cells) else "" for cells in zip(*parts, strict=True)]


def _chosen(table: Matched, name: str) -> str:
    """The header that a name of --segment-by means."""
    if name in table.raw.columns:
        return name
    alike = [header for header in table.raw.columns if plain(header) == plain(name)]
    if len(alike) == 1:
        return alike[0]
    if table.has(name):
        return table.names[name]
    raise DataError(
        _("there is no column '{name}' to build segments from; the file's columns are: {columns}.").format(
            name=name, columns=table.raw.headers()
        ),
        place=table.raw.file,
        remedy=_("Correct --segment-by."),
    )


@dataclass(frozen=True)
class _Columns:
    """The cells of an items table, column by column."""

    texts: dict[str, list[str]]
    numbers: dict[str, Floats]
    shares: dict[str, Floats]
    flags: dict[str, Floats]
    space: Floats
    contents: list[tuple[float, str]]
    segments: list[str]
    extra: dict[str, list[str | float | None]]

    def item(self, k: int, is_offer: bool) -> Item:
        """The record of row k."""
        return Item(
            code=self.texts["item"][k],
            description=self.texts["description"][k],
            segment=self.segments[k],
            brand=self.texts["brand"][k],
            supplier=self.texts["supplier"][k],
            own_label=bool(self.flags["own_label"][k]),
            content=self.contents[k][0],
            content_unit=self.contents[k][1],
            space_cm=float(self.space[k]),
            vat_rate=float(np.nan_to_num(self.shares["vat_rate"][k])),
            cost=_positive(self.numbers["cost"][k]),
            price=_positive(self.numbers["price"][k]),
            keep=bool(self.flags["keep"][k]),
            is_offer=is_offer,
            offered_to=_clusters(self.texts["clusters"][k]),
            attributes=tuple(
                (name, value) for name, cells in self.extra.items() if (value := cells[k]) is not None
            ),
        )


def _item_columns(table: Matched, ledger: Ledger, segment_by: tuple[str, ...]) -> _Columns:
    rows = np.arange(len(table.raw))
    marks = decimal_marks(table, (*_NUMBERS, *_SHARES))
    _report_unreadable(table, _NUMBERS, marks, ledger)
    unknown = np.full(rows.size, np.nan)
    numbers = {
        name: read_numbers(table.column(name), marks[name]).values if table.has(name) else unknown
        for name in _NUMBERS
    }
    facings = np.fmax(np.nan_to_num(numbers["facings"]), np.nan_to_num(numbers["min_facings"]))
    space = _lengths(table, "space_cm", marks)
    width = _lengths(table, "width_cm", marks)
    return _Columns(
        texts={
            name: table.column(name).cells(rows) if table.has(name) else [""] * rows.size
            for name in ("item", "description", "brand", "supplier", "category", "clusters")
        },
        numbers=numbers,
        shares={
            name: rates(table.column(name), marks[name]) if table.has(name) else unknown for name in _SHARES
        },
        flags={
            name: read_flags(table.column(name))[0] if table.has(name) else np.zeros(rows.size)
            for name in ("own_label", "keep")
        },
        space=np.where(space > 0.0, space, width * np.maximum(facings, 1.0)),
        contents=_contents(table),
        segments=segment_texts(table, segment_by),
        extra=_attributes(table, segment_by),
    )


def read_items(table: Matched, ledger: Ledger, segment_by: tuple[str, ...], offers: bool) -> list[ItemRow]:
    """One record per code, the first row of a code counting; defects noted in the ledger."""
    columns = _item_columns(table, ledger, segment_by)
    found: list[ItemRow] = []
    seen: set[str] = set()
    left: dict[str, list[int]] = {"duplicate_item": [], "blank_item": []}
    for k, code in enumerate(columns.texts["item"]):
        if not code or code in seen:
            left["duplicate_item" if code else "blank_item"].append(k)
            continue
        seen.add(code)
        rate = float(columns.shares["margin_rate"][k])
        found.append(
            ItemRow(
                columns.item(k, offers),
                columns.texts["category"][k],
                rate if np.isfinite(rate) else None,
                table.raw.file,
                int(table.raw.rows[k]),
            )
        )
    for code, rows in left.items():
        ledger.note_rows(code, table.raw, np.array(rows, dtype=np.int64))
    _check_digits(table, ledger)
    return found


def _positive(value: float) -> float | None:
    return float(value) if np.isfinite(value) and value > 0.0 else None


def _clusters(text: str) -> tuple[str, ...]:
    names = tuple(part.strip() for part in re.split(r"[,;|/+]", text) if part.strip())
    return () if any(name.casefold() in ("all", "all clusters", "*") for name in names) else names


def _contents(table: Matched) -> list[tuple[float, str]]:
    """(content, unit) per row; different units of one kind become litres or kilograms."""
    n = len(table.raw)
    if not table.has("content"):
        return [(0.0, "")] * n
    rows = np.arange(n)
    header_unit = re.split(r"[\W_]+", table.names["content"].casefold())[-1]
    units = table.column("content_unit").cells(rows) if table.has("content_unit") else [""] * n
    found: list[tuple[float, str]] = []
    for text, unit in zip(table.column("content").cells(rows), units, strict=True):
        match = _CONTENT.match(text)
        if not match:
            found.append((0.0, unit))
            continue
        value = float(match[2].replace(",", ".")) * float(match[1] or 1)
        found.append((value, unit or match[3] or (header_unit if header_unit in _UNITS else "")))
    kinds = {unit.casefold() for value, unit in found if value}
    if len(kinds) > 1 and kinds <= set(_UNITS):
        return [
            (value * _UNITS[unit.casefold()][1], _UNITS[unit.casefold()][0]) if value else (0.0, "")
            for value, unit in found
        ]
    return found


def _attributes(table: Matched, segment_by: tuple[str, ...]) -> dict[str, list[str | float | None]]:
    """Columns that are none of ours and tell items apart: numbers as numbers, else text."""
    rows = np.arange(len(table.raw))
    used = {_chosen(table, name) for name in segment_by}
    kept: dict[str, list[str | float | None]] = {}
    for header in table.unmatched():
        column = table.raw.columns[header]
        texts = column.texts()
        filled = int((column.codes >= 0).sum())
        if header in used or len(texts) < 2:
            continue
        values = [parse_number(text, ".") for text in texts]
        is_number = all(v is not None for v in values) and not any(re.match(r"^0\d", t) for t in texts)
        if not is_number and len(texts) == filled and filled > 10:
            continue  # a name of its own for every item
        cells = column.cells(rows)
        number = {text: float(value) for text, value in zip(texts, values, strict=True) if value is not None}
        kept[header] = [(number[c] if is_number else c) if c else None for c in cells]
    return kept


def _check_digits(table: Matched, ledger: Ledger) -> None:
    if not table.has("gtin"):
        return
    cells = table.column("gtin").cells(np.arange(len(table.raw)))
    wrong = [
        (table.raw.file, int(table.raw.rows[k]), cell)
        for k, cell in enumerate(cells)
        if cell.isdecimal() and len(cell) in LENGTHS and not is_valid(cell)
    ]
    ledger.note_other("gtin_check_digit", wrong)


def read_stores(table: Matched | None, sold_in: list[str], ledger: Ledger) -> list[Store]:
    """Stores of the stores table, or those that the sales name; one cluster "all" by default."""
    if table is None:
        return [Store(code, cluster="all") for code in sorted(sold_in)]
    rows = np.arange(len(table.raw))
    marks = decimal_marks(table, ("space_cm",))
    _report_unreadable(table, ("space_cm",), marks, ledger)
    space = _lengths(table, "space_cm", marks)

    def texts(name: str, default: str) -> list[str]:
        return table.column(name).cells(rows) if table.has(name) else [default] * rows.size

    clusters, regions, sizes = texts("cluster", "all"), texts("region", ""), texts("size", "")
    found: dict[str, Store] = {}
    twice: list[int] = []
    for k, code in enumerate(texts("store", "")):
        if code in found:
            twice.append(k)
        elif code:
            room = float(space[k]) if space[k] > 0.0 else None
            found[code] = Store(code, clusters[k] or _("without cluster"), room, regions[k], sizes[k])
    ledger.note_rows("duplicate_store", table.raw, np.array(twice, dtype=np.int64))
    return list(found.values())
