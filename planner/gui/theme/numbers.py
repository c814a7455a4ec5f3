"""Numbers, money, shares and dates as the user's locale writes them."""

from __future__ import annotations

import math
from datetime import date

from PySide6.QtCore import QDate, QDateTime, QLocale, Qt

from planner.base.text import _

MINUS, EN_DASH = "−", "–"


def number(value: float, decimals: int = 0, signed: bool = False) -> str:
    """A number; ``signed`` puts a plus before gains.  Empty for NaN."""
    if math.isnan(value):
        return ""
    text = QLocale().toString(float(abs(value)), "f", decimals)
    # What rounds to zero has no sign.
    zero = not any(c.isdigit() and c not in "0٠۰" for c in text)
    if zero:
        return text
    if value < 0.0:
        return MINUS + text
    return "+" + text if signed else text


def percent(part: float, decimals: int = 0, signed: bool = False) -> str:
    """A part of 1 as per cent."""
    text = number(100.0 * part, decimals, signed)
    return _("{number} %").format(number=text) if text else ""


def span(low: float, high: float, decimals: int = 0, signed: bool = False) -> str:
    """An interval: "+3 to +9"."""
    if math.isnan(low) or math.isnan(high):
        return ""
    return _("{low} to {high}").format(low=number(low, decimals, signed), high=number(high, decimals, signed))


def day(value: date) -> str:
    """A date in the locale's short form."""
    return QLocale().toString(QDate(value.year, value.month, value.day), QLocale.FormatType.ShortFormat)


def moment(iso: str) -> str:
    """An ISO time in the locale's short form and the machine's time zone; other texts as they are."""
    parsed = QDateTime.fromString(iso, Qt.DateFormat.ISODate)
    if not parsed.isValid():
        return iso
    return QLocale().toString(parsed.toLocalTime(), QLocale.FormatType.ShortFormat)


def duration(seconds: float) -> str:
    """Elapsed time: "8 s" or "2 min 05 s"."""
    whole = int(seconds)
    if whole < 60:
        return _("{seconds} s").format(seconds=whole)
    return _("{minutes} min {seconds:02d} s").format(minutes=whole // 60, seconds=whole % 60)


def sensible_decimals(largest: float) -> int:
    """Decimals that leave about three figures of ``largest``."""
    size = abs(largest)
    if not math.isfinite(size) or size >= 100.0 or size == 0.0:
        return 0
    return 1 if size >= 10.0 else 2
