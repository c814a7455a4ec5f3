"""What was read, what was done to it, and what was set aside: the reconciliation."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from decimal import Decimal

import pandas as pd

from planner.catalogue.items import Catalogue
from planner.sales.panel import BaseWeek, MarketPanel
from planner.sales.request import LoadRequest


@dataclass(frozen=True)
class Check:
    """One check of the rows.

    code: stable name ("duplicate_row"); title, treatment: words for the user.
    rows, money: how many sales rows and how much revenue it touched.
    set_aside: True when those rows (and that money) are not used.
    examples: (file name, row number, what stood there), first few.
    """

    code: str
    title: str
    rows: int
    money: Decimal
    set_aside: bool
    treatment: str
    examples: tuple[tuple[str, int, str], ...] = ()


@dataclass(frozen=True)
class ListingEvent:
    """An item that came into or left a store's range inside the history."""

    store: str
    item: str
    week: date
    kind: str  # "listed" | "delisted"


@dataclass(frozen=True)
class LoadReport:
    """money_read = money_used + the money of every check with set_aside, exactly."""

    rows_read: int
    rows_used: int
    money_read: Decimal
    money_used: Decimal
    checks: tuple[Check, ...]
    matches: tuple[tuple[str, str, str], ...]
    events: tuple[ListingEvent, ...]
    notes: tuple[str, ...]


@dataclass(frozen=True)
class LoadedData:
    """Everything later layers need, in the catalogue's orders.

    set_aside: the rows not used (file, row, reason, then the file's own columns as text).
    """

    request: LoadRequest
    catalogue: Catalogue
    panel: MarketPanel
    base: BaseWeek
    report: LoadReport
    set_aside: pd.DataFrame
