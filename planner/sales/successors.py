"""Codes that took over from older codes: one history under the newest code."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import DataError
from planner.base.text import _
from planner.sales.codes import CodeIndex
from planner.sales.matching import Matched
from planner.sales.money import decimal_marks, read_numbers

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class Joining:
    """Where every item's history goes.

    target (n,): position of the item that carries the history on (itself when none replaced it).
    factor (n,): how many units of the target one unit of the item is: 1 / pack factor.
    notes: each joining in words.
    """

    target: Ints
    factor: Floats
    notes: tuple[str, ...] = field(default=())


def no_successors(n_items: int) -> Joining:
    """Every item keeps its own history."""
    return Joining(np.arange(n_items), np.ones(n_items))


def read_successors(table: Matched | None, items: CodeIndex, codes: list[str]) -> Joining:
    """Follow old -> new until the newest code.

    The pack factor says how many old units one new unit holds (2: a twin pack replaced a single one).
    Raises DataError when a code would in the end replace itself.
    """
    target, factor = np.arange(len(codes)), np.ones(len(codes))
    if table is None:
        return Joining(target, factor)
    old = [items.find(text)[0] for text in table.column("old_item").cells(np.arange(len(table.raw)))]
    new = [items.find(text)[0] for text in table.column("new_item").cells(np.arange(len(table.raw)))]
    packs = np.ones(len(table.raw))
    if table.has("pack_factor"):
        mark = decimal_marks(table, ("pack_factor",))["pack_factor"]
        values = read_numbers(table.column("pack_factor"), mark).values
        packs = np.where(np.isfinite(values) & (values > 0.0), values, 1.0)
    notes: list[str] = []
    for a, b, pack in zip(old, new, packs, strict=True):
        if a >= 0 and b >= 0 and a != b:
            target[a], factor[a] = b, 1.0 / float(pack)
    for row, (a, b) in enumerate(zip(old, new, strict=True)):
        if a < 0 or b < 0 or a == b:
            words = table.raw.line(row)
            notes.append(_("Successor not used, a code is unknown: {words}.").format(words=words))
    final, total = target.copy(), factor.copy()
    for _step in range(len(codes)):
        moving = target[final] != final
        if not moving.any():
            break
        total = np.where(moving, total * factor[final], total)
        final = np.where(moving, target[final], final)
        if (final[moving] == np.flatnonzero(moving)).any():
            ring = codes[int(np.flatnonzero(moving)[0])]
            raise DataError(
                _("item {item} would replace itself by way of its successors.").format(item=ring),
                place=table.raw.file,
                remedy=_("Correct the rows that name it."),
            )
    for a in np.flatnonzero(final != np.arange(len(codes))).tolist():
        notes.append(
            _("{old} was replaced by {new}; one history, 1 unit of {old} = {factor:g} of {new}.").format(
                old=codes[a], new=codes[int(final[a])], factor=float(total[a])
            )
        )
    return Joining(final, total, tuple(notes))
