"""What was found in the rows: one ledger that every row and every amount of money passes through."""

from __future__ import annotations

from dataclasses import dataclass, field
from decimal import Decimal

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from planner.base.text import _
from planner.sales.columns import RawTable
from planner.sales.money import Exact
from planner.sales.report import Check

Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]

EXAMPLES = 5

# code: (title, what is done).  The order is the order of the report.
WORDS: dict[str, tuple[str, str]] = {
    "crooked_row": (_("Row with another number of cells than the header"), _("set aside")),
    "total_line": (_("Total or subtotal line"), _("set aside")),
    "other_category": (_("Row of another category"), _("set aside")),
    "blank_code": (_("No item or store code"), _("set aside")),
    "unknown_item": (_("Item that is not in the items table"), _("set aside")),
    "unknown_store": (_("Store that is not in the stores table"), _("set aside")),
    "unreadable_week": (_("Date or week that cannot be read"), _("set aside")),
    "unreadable_number": (_("Text where units or money should stand"), _("set aside")),
    "blank_number": (_("No units, or units without money"), _("set aside")),
    "stray_week": (_("Week far away from all others"), _("set aside")),
    "duplicate_row": (_("Row that repeats an earlier row exactly"), _("set aside")),
    "conflicting_duplicate": (_("Several different rows for one store, day or week, and item"), _("summed")),
    "successor_row": (_("Row of a code that was replaced"), _("joined into its successor's history")),
    "sign_mismatch": (_("Units and money with opposite signs"), _("set aside")),
    "zero_price": (_("Units sold for no money"), _("set aside")),
    "money_without_units": (_("Money without units"), _("set aside")),
    "absurd_price": (_("Price above ten times, or below a tenth of, the item's median"), _("set aside")),
    "return_set_aside": (_("Returns that exceed the week's sales"), _("set aside")),
    "return_netted": (_("Returns (negative units)"), _("netted in the week")),
    "closed_store": (_("Store without sales in the latest weeks"), _("set aside")),
    "similar_code": (
        _("Item code that differs only by case, spaces or leading zeros"),
        _("taken as the code in the items table"),
    ),
    "similar_store_code": (
        _("Store code that differs only by case, spaces or leading zeros"),
        _("taken as the code in the stores table"),
    ),
    "outside_range": (_("Sales in a week outside the item's range in that store"), _("taken as on sale")),
    "not_in_ranges": (
        _("Sales of an item that the ranges table does not name for that store"),
        _("range inferred from the sales"),
    ),
    "part_week": (_("First or last week with fewer days than a week"), _("counted as a part of a week")),
    "cost_above_price": (_("Item whose cost is above its price before VAT"), _("kept; check the cost")),
    "gtin_check_digit": (_("GTIN with a wrong check digit"), _("kept; check the code")),
    "duplicate_item": (_("Item listed twice in the items table"), _("the first row counts")),
    "blank_item": (_("Row of the items table without a code"), _("not used")),
    "duplicate_store": (_("Store listed twice in the stores table"), _("the first row counts")),
    "item_without_segment": (
        _("Item without a segment"),
        _("put into a segment of its own; an offer is left out"),
    ),
    "never_sold": (_("Item in the items table that was never sold"), _("left out, or an offer when it has "
                     "price and cost")),
    "segment_with_one_item": (_("Segment with one item"), _("kept; its transfers inside are unknown")),
    "offer_already_sold": (_("Offer for an item that is already sold"), _("the offer is left out")),
    "unknown_code": (
        _("Row of another table for an item or store that no table knows"),
        _("not used"),
    ),
    "backward_range": (_("Range that ends before it starts"), _("not used")),
    "unreadable_cell": (_("Unreadable cell in another table"), _("taken as blank")),
}  # fmt: skip


@dataclass
class Ledger:
    """Which sales rows are used, which are set aside and why.

    reason (n,): 0 for a row in use, else the position of its code in ``codes`` plus 1.
    """

    raw: RawTable
    money: Exact
    reason: NDArray[np.int16]
    codes: list[str] = field(default_factory=list)
    noted: dict[str, Check] = field(default_factory=dict)

    def set_aside(self, code: str, picked: Bools) -> None:
        """Take the picked rows that are still in use out of use."""
        if not picked.any():
            return
        picked = picked & (self.reason == 0)
        if picked.any():
            if code not in self.codes:
                self.codes.append(code)
            self.reason[picked] = self.codes.index(code) + 1

    def note(self, code: str, rows: Ints) -> None:
        """Report rows that stay in use."""
        if rows.size:
            title, treatment = WORDS[code]
            examples = tuple(
                (self.raw.file, int(self.raw.rows[row]), self.raw.line(int(row))) for row in rows[:EXAMPLES]
            )
            self.noted[code] = Check(
                code, title, int(rows.size), self.money.total(rows), False, treatment, examples
            )

    def note_other(self, code: str, examples: list[tuple[str, int, str]]) -> None:
        """Report something outside the sales rows; every example is one finding."""
        self._add(code, examples, len(examples))

    def note_rows(self, code: str, raw: RawTable, rows: Ints) -> None:
        """Report rows of another table."""
        examples = [(raw.file, int(raw.rows[row]), raw.line(int(row))) for row in rows[:EXAMPLES]]
        self._add(code, examples, int(rows.size))

    def _add(self, code: str, examples: list[tuple[str, int, str]], count: int) -> None:
        if not count:
            return
        title, treatment = WORDS[code]
        before = self.noted.get(code)
        rows = count + (before.rows if before else 0)
        shown = ((before.examples if before else ()) + tuple(examples))[:EXAMPLES]
        self.noted[code] = Check(code, title, rows, Decimal(0), False, treatment, shown)

    @property
    def used(self) -> Bools:
        """Rows in use (n,)."""
        used: Bools = self.reason == 0
        return used

    def checks(self) -> tuple[Check, ...]:
        """Every check that found something, set aside or not, in the report's order."""
        found = dict(self.noted)
        for position, code in enumerate(self.codes, start=1):
            rows = np.flatnonzero(self.reason == position)
            if rows.size == 0:
                continue
            title, treatment = WORDS[code]
            examples = tuple(
                (self.raw.file, int(self.raw.rows[row]), self.raw.line(int(row))) for row in rows[:EXAMPLES]
            )
            found[code] = Check(
                code, title, int(rows.size), self.money.total(rows), True, treatment, examples
            )
        return tuple(found[code] for code in WORDS if code in found)

    def rows_set_aside(self) -> pd.DataFrame:
        """The rows not used as text: file, row, reason, then the file's own columns."""
        rows = np.flatnonzero(self.reason > 0)
        reasons = [WORDS[self.codes[k - 1]][0] for k in self.reason[rows]]
        return self.raw.frame(rows, reasons)
