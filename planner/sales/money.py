"""Numbers from text: decimal marks, and money as exact integers of a small unit."""

from __future__ import annotations

import re
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from planner.base.errors import DataError
from planner.base.text import _
from planner.sales.columns import TextColumn
from planner.sales.matching import Matched

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
Codes = NDArray[np.int32]

BLANK_WORDS = frozenset(("null", "na", "n/a", "#n/a", "nan", "none", "nil", "-", "--", "?"))
_PLAIN = r"^[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)$"
_PLAIN_COMMA = r"^[+-]?([0-9]+,?[0-9]*|,[0-9]+)$"
_MARKS = {
    ",": r"^\D*\d+,(\d{1,2}|\d{4,})\D*$|\.\d{3},\d|^\D*0*,\d|^\D*0,\d|\d\.\d{3}\.\d{3}",
    ".": r"^\D*\d+\.(\d{1,2}|\d{4,})\D*$|,\d{3}\.\d|^\D*0*\.\d|^\D*0\.\d|\d,\d{3},\d{3}",
}
_UNCLEAR = {",": r"^\D*[1-9]\d{0,2},\d{3}\D*$", ".": r"^\D*[1-9]\d{0,2}\.\d{3}\D*$"}
_MOST_DECIMALS = 9
_EXACT_IN_FLOAT = 2.0**50


@dataclass(frozen=True)
class Exact:
    """Amounts as integers: amount of row k = minor[codes[k]] / 10**scale.

    minor: the different amounts, int64 or Python integers, and a 0 at the end for blank cells.
    """

    codes: Codes
    minor: NDArray[np.generic]
    scale: int

    def total(self, picked: Bools | NDArray[np.int64] | None = None) -> Decimal:
        """Exact sum over the picked rows."""
        codes = self.codes if picked is None else self.codes[picked]
        # Counting each amount keeps the sum in integers whatever the number of rows.
        counts = np.bincount(codes + 1, minlength=self.minor.size)
        different = np.flatnonzero(counts)
        amounts: Any = self.minor[different - 1]
        if different.size and _may_overflow(amounts, int(counts.sum())):
            amounts = amounts.astype(object)
        return Decimal(int((amounts * counts[different]).sum())).scaleb(-self.scale)

    def has_fractions(self) -> bool:
        """Whether some amount is not a whole number."""
        whole: Any = self.minor
        return self.scale > 0 and bool((whole % 10**self.scale != 0).any())

    def rows(self) -> NDArray[np.generic]:
        """The amount of every row in minor units."""
        return self.minor[self.codes]

    def filled(self, other: Exact, picked: Bools) -> Exact:
        """The picked rows from ``other``, all on one scale."""
        scale = max(self.scale, other.scale)
        parts = [part.rows().astype(object) * 10 ** (scale - part.scale) for part in (self, other)]
        return exact_rows(np.where(picked, parts[1], parts[0]), scale)

    def times(self, other: Exact) -> Exact:
        """Exact products row by row."""
        a, b = self.rows(), other.rows()
        if a.size and a.dtype != object and b.dtype != object and _may_overflow(a, int(np.abs(b).max())):
            a = a.astype(object)
        return exact_rows(a * b, self.scale + other.scale)  # type: ignore[operator]


def exact_rows(minor: NDArray[np.generic], scale: int) -> Exact:
    """Amounts row by row."""
    return Exact(np.arange(minor.size, dtype=np.int32), np.append(minor, np.zeros(1, minor.dtype)), scale)


def _may_overflow(amounts: NDArray[np.generic], times: int) -> bool:
    return amounts.dtype != object and int(np.abs(amounts).max()) * times >= 2**62


@dataclass(frozen=True)
class Numbers:
    """One number column: values (n,) with NaN where blank or unreadable; both marked."""

    values: Floats
    blank: Bools
    bad: Bools
    exact: Exact


def read_numbers(column: TextColumn, mark: str) -> Numbers:
    """All cells of a column as numbers, ``mark`` being the decimal mark."""
    values, minor, scale, state = _distinct(column.values, mark)
    minor = np.append(minor, np.zeros(1, dtype=minor.dtype))
    return Numbers(
        np.append(values, np.nan)[column.codes],
        column.spread(state == 1, blank=True),
        column.spread(state == 2),
        Exact(column.codes, minor, scale),
    )


def _distinct(texts: pa.StringArray, mark: str) -> tuple[Floats, NDArray[np.generic], int, NDArray[np.int8]]:
    """Values, minor units, their scale, and state (0 number, 1 blank, 2 unreadable) of distinct texts."""
    n = len(texts)
    if n == 0:
        return np.zeros(0), np.zeros(0, dtype=np.int64), 0, np.zeros(0, dtype=np.int8)
    if mark == ",":
        simple = pc.match_substring_regex(texts, _PLAIN_COMMA)
        texts = pc.if_else(simple, pc.replace_substring(texts, ",", "."), texts)
    else:
        simple = pc.match_substring_regex(texts, _PLAIN)
    is_plain = simple.to_numpy(zero_copy_only=False)
    numbers = pc.replace_substring_regex(pc.if_else(simple, texts, "0"), r"^\+", "")
    values = pc.cast(numbers, pa.float64()).to_numpy(zero_copy_only=False).copy()
    point = pc.find_substring(numbers, ".").to_numpy(zero_copy_only=False)
    length = pc.utf8_length(numbers).to_numpy(zero_copy_only=False)
    decimals = np.where(point >= 0, length - point - 1, 0)
    state = np.zeros(n, dtype=np.int8)
    odd: dict[int, Decimal] = {}
    for k in np.flatnonzero(~is_plain):
        text = texts[int(k)].as_py()
        number = parse_number(text, mark)
        if number is None:
            state[k] = 1 if text.casefold() in BLANK_WORDS else 2
            values[k] = np.nan
        else:
            odd[int(k)] = number
            values[k] = float(number)
            decimals[k] = max(0, -int(number.as_tuple().exponent))
    scale = int(decimals.max(initial=0))
    size = np.nanmax(np.abs(values), initial=0.0) * 10.0**scale
    if scale <= _MOST_DECIMALS and size < _EXACT_IN_FLOAT:
        minor: NDArray[np.generic] = np.rint(np.nan_to_num(values) * 10.0**scale).astype(np.int64)
        for place, number in odd.items():
            minor[place] = int(number.scaleb(scale))
        return values, minor, scale, state
    exact = [Decimal(numbers[k].as_py()) if is_plain[k] else odd.get(k, Decimal(0)) for k in range(n)]
    return (
        values,
        np.array([int(number.scaleb(scale)) for number in exact] or [0], dtype=object),
        scale,
        state,
    )


def parse_number(text: str, mark: str) -> Decimal | None:
    """One number as people write it: currency signs, thousands marks, (1.50), 1.50-; else None."""
    body = re.sub(r"[\s\u00a0\u202f'’]", "", text)
    body = re.sub(r"^[^\d+\-(.,]{1,3}|(?<=\d)(€|£|\$|[A-Za-z]{3})$", "", body)
    negative = False
    if body.startswith("(") and body.endswith(")"):
        body, negative = body[1:-1], True
    if body.endswith("-"):
        body, negative = body[:-1], not negative
    body = re.sub(r"^([+-]?)(€|£|\$)", r"\1", body)
    other = "." if mark == "," else ","
    if other in body:
        whole = body.split(mark)[0]
        if not re.fullmatch(rf"[+-]?\d{{1,3}}(\{other}\d{{3}})+", whole) or other in body[len(whole) :]:
            return None
        body = body.replace(other, "")
    body = body.replace(mark, ".")
    if not re.fullmatch(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d{1,2})?", body):
        return None
    try:
        number = Decimal(body)
    except InvalidOperation:
        return None
    return -number if negative else number


def decimal_marks(table: Matched, ours: tuple[str, ...]) -> dict[str, str]:
    """The decimal mark of every number column that is there, found in its cells.

    A column without evidence follows the table's other columns; DataError when cells such as
    1,234 could be read both ways and nothing in the table tells.
    """
    columns = [name for name in ours if table.has(name)]
    said = table.choices.get("decimal_mark", "")
    if said in (",", "."):
        return dict.fromkeys(columns, said)
    found: dict[str, str] = {}
    counts = {",": 0, ".": 0}
    for name in columns:
        seen = {mark: _count(table.column(name).values, rule) for mark, rule in _MARKS.items()}
        for mark, number in seen.items():
            counts[mark] += number
        if seen[","] != seen["."]:
            found[name] = max(seen, key=lambda mark: seen[mark])
    general = max(counts, key=lambda mark: counts[mark]) if counts[","] != counts["."] else ""
    for name in columns:
        if name in found:
            continue
        if not general:
            _ask_when_unclear(table, name)
        found[name] = general or "."
    return found


def _count(values: pa.StringArray, rule: str) -> int:
    if len(values) == 0:
        return 0
    return int(pc.sum(pc.match_substring_regex(values, rule)).as_py() or 0)


def _ask_when_unclear(table: Matched, name: str) -> None:
    values = table.column(name).values
    for mark, rule in _UNCLEAR.items():
        # A file that is divided by commas writes its decimals with a point.
        if mark == "." and table.raw.delimiter in (",", ""):
            continue
        hits = pc.match_substring_regex(values, rule)
        if len(values) and pc.any(hits).as_py():
            example = values.filter(hits)[0].as_py()
            raise DataError(
                _("'{example}' could be read with a decimal mark or a thousands mark.").format(
                    example=example
                ),
                place=table.place(name),
                remedy=_(
                    "Say which with --match {table}.decimal_mark=, or --match {table}.decimal_mark=."
                ).format(table=table.raw.name),
            )


def read_flags(column: TextColumn) -> tuple[Floats, Bools]:
    """0/1 per cell (blank 0) and which cells were no yes or no."""
    yes = {"1", "y", "yes", "true", "t", "x", "j", "ja", "oui", "si", "promo", "1.0"}
    no = {"0", "n", "no", "false", "f", "nein", "non", "0.0", *BLANK_WORDS}
    value, bad = [], []
    for text in column.texts():
        word = text.casefold()
        positive = word in yes or (word not in no and (parse_number(word, ".") or 0) > 0)
        value.append(float(positive))
        bad.append(not positive and word not in no and parse_number(word, ".") is None)
    return np.array([*value, 0.0])[column.codes], column.spread(bad)
