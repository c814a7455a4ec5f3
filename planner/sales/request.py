"""What to load: files, column matches and choices that were made."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

TABLES = ("sales", "items", "stores", "shoppers", "costs", "ranges", "offers", "successors")


@dataclass(frozen=True)
class LoadRequest:
    """One loading of one category.

    matches: (table, our column, their name), overrides what the synonyms find.
    category: the category to cut to when the files hold several; empty: the only one.
    segment_by: columns of the items table whose values form the segments.
    baseline_weeks: length of the window (weeks) that "today" is measured on.
    """

    sales: Path
    items: Path
    stores: Path | None = None
    shoppers: Path | None = None
    costs: Path | None = None
    ranges: Path | None = None
    offers: Path | None = None
    successors: Path | None = None
    matches: tuple[tuple[str, str, str], ...] = ()
    category: str = ""
    segment_by: tuple[str, ...] = ()
    baseline_weeks: int = 13
