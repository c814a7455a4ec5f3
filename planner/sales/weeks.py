"""Dates and week codes of any common writing, as ISO 8601 weeks (Monday)."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass
from datetime import date

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import DataError
from planner.base.text import _
from planner.sales.columns import TextColumn, column_of
from planner.sales.matching import Matched, plain
from planner.sales.money import BLANK_WORDS

Ints = NDArray[np.int32]
Bools = NDArray[np.bool_]

FIRST_YEAR, LAST_YEAR = 1980, 2099
_EXCEL_EPOCH = date(1899, 12, 30).toordinal()
_MONTH_NAMES = (
    "jan january januar janvier",
    "feb february februar",
    "mar march mrz maerz mars",
    "apr april avril",
    "may mai",
    "jun june juni juin",
    "jul july juli juillet",
    "aug august aout",
    "sep sept september septembre",
    "oct october okt oktober octobre",
    "nov november novembre",
    "dec december dez dezember decembre",
)
_MONTHS = {name: k for k, names in enumerate(_MONTH_NAMES, start=1) for name in names.split()}


@dataclass(frozen=True)
class Calendar:
    """How dates and week codes are read.

    date_order: "dmy", "mdy", or "" when nothing has told yet.
    first_code, first_monday, long_years: a retailer's own weeks: the Monday of one code, and the
        years with 53 weeks; first_monday None: ISO weeks.
    """

    date_order: str = ""
    first_code: tuple[int, int] = (0, 0)
    first_monday: date | None = None
    long_years: frozenset[int] = frozenset()

    def monday(self, year: int, week: int) -> int | None:
        """Ordinal of the Monday of a week code; None when there is no such week."""
        if self.first_monday is None:
            try:
                return date.fromisocalendar(year, week, 1).toordinal()
            except ValueError:
                return None
        if not 1 <= week <= (53 if year in self.long_years else 52):
            return None
        first_year, first_week = self.first_code
        step = 1 if year >= first_year else -1
        between = range(first_year, year) if step > 0 else range(year, first_year)
        weeks = sum(53 if y in self.long_years else 52 for y in between) * step + week - first_week
        return self.first_monday.toordinal() + 7 * weeks


@dataclass(frozen=True)
class Days:
    """One date or week column.

    week (n,): weeks since the Monday 0001-01-01 (see ``monday_of``).  day (n,): ordinals
    (datetime.date.toordinal); week codes count as their Monday; 0 where blank or unreadable.
    daily: the column holds single days of the week.
    """

    week: Ints
    day: Ints
    blank: Bools
    bad: Bools
    daily: bool


_YMD = re.compile(r"^(\d{4})[-/.](\d{1,2})[-/.](\d{1,2})$")
_COMPACT = re.compile(r"^(19|20)(\d{2})(\d{2})(\d{2})$")
_DMY = re.compile(r"^(\d{1,2})([-/.])(\d{1,2})\2(\d{4}|\d{2})$")
_WORDS = re.compile(r"^(\d{1,2})[ \-.]*([A-Za-z]+)[ \-.,]*(\d{4}|\d{2})$")
_WORDS_US = re.compile(r"^([A-Za-z]+)[ \-.]*(\d{1,2})[ ,\-]+(\d{4})$")
_WEEK = re.compile(r"^(\d{4})[-/. ]?(?:W|w|wk|WK|KW)?[-/. ]?(\d{1,2})$")
_WEEK_DAY = re.compile(r"^(\d{4})-?[Ww](\d{2})-?([1-7])$")
_WEEK_BACK = re.compile(r"^(?:W|w|wk|WK|Wk|KW|week|Week)?[ .\-]?(\d{1,2})[-/. ]+(\d{4})$")
_EXCEL = re.compile(r"^([3-5]\d{4})(\.\d+)?$")
_TIME = re.compile(r"[T ]\d{1,2}:\d{2}.*$")


def _year(text: str) -> int:
    return int(text) if len(text) == 4 else 2000 + int(text)


def week_code(text: str) -> tuple[int, int] | None:
    """(year, week) of a week code such as 2024-W05, 202405, 2024W5 or 05/2024."""
    found = _WEEK.match(text)
    if found:
        return int(found[1]), int(found[2])
    found = _WEEK_BACK.match(text)
    return (int(found[2]), int(found[1])) if found else None


def _day(year: int, month: int, day: int) -> int | None:
    if not FIRST_YEAR <= year <= LAST_YEAR:
        return None
    try:
        return date(year, month, day).toordinal()
    except ValueError:
        return None


def _read(text: str, calendar: Calendar) -> tuple[str, int | None]:
    """("day" | "week" | "?", ordinal or None) of one text."""
    if found := _YMD.match(text):
        return "day", _day(int(found[1]), int(found[2]), int(found[3]))
    if found := _COMPACT.match(text):
        return "day", _day(int(found[1] + found[2]), int(found[3]), int(found[4]))
    if found := _DMY.match(text):
        a, b = int(found[1]), int(found[3])
        us = calendar.date_order == "mdy" and found[2] != "."
        return "day", _day(_year(found[4]), a if us else b, b if us else a)
    if found := _WEEK_DAY.match(text):
        monday = calendar.monday(int(found[1]), int(found[2]))
        return "day", None if monday is None else monday + int(found[3]) - 1
    for pattern, month, day in ((_WORDS, 2, 1), (_WORDS_US, 1, 2)):
        found = pattern.match(text)
        if found and plain(found[month]) in _MONTHS:
            return "day", _day(_year(found[3]), _MONTHS[plain(found[month])], int(found[day]))
    code = week_code(text)
    if code is not None and FIRST_YEAR <= code[0] <= LAST_YEAR:
        return "week", calendar.monday(*code)
    if found := _EXCEL.match(text):
        return "day", _EXCEL_EPOCH + int(found[1])
    return "?", None


def _without_time(column: TextColumn) -> TextColumn:
    texts = column.texts()
    if not any(":" in text for text in texts):
        return column
    short = column_of([_TIME.sub("", text) for text in texts])
    return TextColumn(np.append(short.codes, np.int32(-1))[column.codes], short.values)


def joined_year_week(year: TextColumn, week: TextColumn) -> TextColumn:
    """Week numbers with their year's column as week codes."""
    y, w = year.texts(), week.texts()
    size = max(len(w), 1)
    pair = np.where(
        (year.codes >= 0) & (week.codes >= 0), year.codes.astype(np.int64) * size + week.codes, -1
    )
    different, codes = np.unique(pair, return_inverse=True)
    cells = ["" if p < 0 else f"{y[p // size]}-W{re.sub(r'[^0-9]', '', w[p % size])}" for p in different]
    joined = column_of(cells)
    return TextColumn(joined.codes[codes], joined.values)


def date_column(table: Matched) -> tuple[str, TextColumn]:
    """(our column, cells) of the finest date or week column of sales or shoppers."""
    if table.has("date"):
        cells = table.column("date")
        # One and the same date in every row is the day of the export.
        if not table.has("week") or len(cells.values) > 1 or len(table.raw) == 1:
            return "date", cells
    cells = table.column("week")
    if table.has("year") and all(re.fullmatch(r"[A-Za-z ]*\d{1,2}", text) for text in cells.texts()):
        return "week", joined_year_week(table.column("year"), cells)
    return "week", cells


def settle_calendar(table: Matched, ours: str, cells: TextColumn) -> Calendar:
    """The calendar that the sales table's dates are written in.

    Raises DataError with the option that answers when day and month cannot be told apart, or
    when week codes exist that no ISO year has and nothing says when the retailer's weeks begin.
    """
    order = _date_order(table, ours, _without_time(cells).texts())
    said = table.choices.get("first_monday", "")
    weeks = [code for code in map(week_code, cells.texts()) if code is not None]
    if said:
        return _own_weeks(table, ours, said, weeks, order)
    wrong = [code for code in weeks if Calendar().monday(*code) is None and code[1] == 53]
    if wrong and not _few(cells, wrong):
        year, week = wrong[0]
        raise DataError(
            _("week {week} of {year} is not an ISO week: ISO year {year} has 52 weeks.").format(
                week=week, year=year
            ),
            place=table.place(ours),
            remedy=_(
                "If these are your own fiscal weeks, say which Monday the file's first week begins on: "
                "--match {table}.first_monday=YYYY-MM-DD."
            ).format(table=table.raw.name),
        )
    return Calendar(order)


def _few(cells: TextColumn, codes: list[tuple[int, int]]) -> bool:
    """Fewer rows than a week's usual number: a slip, not a calendar."""
    texts = cells.texts()
    counts = np.bincount(cells.codes[cells.codes >= 0], minlength=len(texts))
    odd = np.array([week_code(text) in codes for text in texts])
    return bool(counts[odd].sum() < 0.001 * counts.sum())


def _own_weeks(table: Matched, ours: str, said: str, weeks: list[tuple[int, int]], order: str) -> Calendar:
    try:
        first = date.fromisoformat(said)
    except ValueError:
        first = date.min
    if first == date.min or first.weekday() != 0 or not weeks:
        raise DataError(
            _("'{said}' does not say which Monday the file's first week code begins on.").format(said=said),
            place=table.place(ours),
            remedy=_(
                "Give a Monday as --match {table}.first_monday=YYYY-MM-DD, for a column of week codes."
            ).format(table=table.raw.name),
        )
    return Calendar(order, min(weeks), first, frozenset(year for year, week in weeks if week == 53))


def _date_order(table: Matched, ours: str, texts: list[str]) -> str:
    said = table.choices.get("date_order", "")
    if said in ("dmy", "mdy"):
        return said
    pairs = [(int(m[1]), int(m[3])) for m in map(_DMY.match, texts) if m and m[2] != "."]
    if not pairs:
        return ""
    day_first, month_first = sum(a > 12 for a, _b in pairs), sum(b > 12 for _a, b in pairs)
    if day_first == month_first:
        example = next(text for text in texts if (m := _DMY.match(text)) and m[2] != ".")
        raise DataError(
            _("'{example}' could be day/month or month/day, and no date in the column tells.").format(
                example=example
            ),
            place=table.place(ours),
            remedy=_(
                "Say which with --match {table}.date_order=dmy or --match {table}.date_order=mdy."
            ).format(table=table.raw.name),
        )
    return "dmy" if day_first > month_first else "mdy"


def read_days(table: Matched, ours: str, cells: TextColumn, calendar: Calendar) -> Days:
    """Every cell's day and Monday.

    Weekly dates that all fall on one weekday other than Monday are weeks that start (or end, when
    the header says so) on it; they become the ISO week that holds most of their days.
    """
    if calendar.date_order == "" and table.choices.get("date_order", "") in ("dmy", "mdy"):
        calendar = Calendar(table.choices["date_order"])
    if calendar.date_order == "" and any(_DMY.match(text) for text in cells.texts()):
        calendar = Calendar(
            _date_order(table, ours, cells.texts()),
            calendar.first_code,
            calendar.first_monday,
            calendar.long_years,
        )
    short = _without_time(cells)
    texts = short.texts()
    read = [("blank", 0) if t.casefold() in BLANK_WORDS else _read(t, calendar) for t in texts]
    day = np.array([ordinal or 0 for _kind, ordinal in read] + [0], dtype=np.int32)
    blank = [kind == "blank" for kind, _ordinal in read]
    bad = (day[:-1] == 0) & ~np.array(blank, dtype=bool)
    used = np.array(sorted({d for d, (kind, _o) in zip(day, read, strict=False) if d and kind == "day"}))
    weekdays = Counter(((used - 1) % 7).tolist())
    daily = len(weekdays) > 1
    shift = 0
    if len(weekdays) == 1 and 0 not in weekdays and len(used) > 1:
        header = plain(table.names.get(ours, ours))
        ends = "end" in header
        starts = any(word in header for word in ("start", "commenc", "begin"))
        shift = -3 if ends else 3 if starts else 0
    week = np.where(day > 0, (day + shift - 1) // 7, 0).astype(np.int32)
    return Days(week[short.codes], day[short.codes], short.spread(blank, True), short.spread(bad), daily)


def monday_of(week: int) -> date:
    """The Monday of a week counted from 0001-01-01."""
    return date.fromordinal(7 * int(week) + 1)
