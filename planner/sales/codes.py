"""Item and store codes: the same code written in different ways."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.sales.columns import TextColumn

Ints = NDArray[np.int32]
Bools = NDArray[np.bool_]


def _loose(code: str) -> str:
    return re.sub(r"\s+", "", code).casefold()


def _bare(code: str) -> str:
    """Without leading zeros, and without the point a spreadsheet adds to a number."""
    return re.sub(r"\.0+$", "", _loose(code)).lstrip("0") or "0"


@dataclass(frozen=True)
class CodeIndex:
    """Finds known codes: exactly, else by one that differs only by case, spaces or leading zeros."""

    exact: dict[str, int]
    loose: dict[str, int]
    bare: dict[str, int]

    def find(self, text: str) -> tuple[int, bool]:
        """(position or -1, whether it is written exactly so)."""
        position = self.exact.get(text, -1)
        if position >= 0:
            return position, True
        position = self.loose.get(_loose(text), -1)
        return (position if position >= 0 else self.bare.get(_bare(text), -1)), False

    def find_all(self, column: TextColumn) -> tuple[Ints, Bools]:
        """Position (n,) of every cell's code, -1 when blank or unknown; cells written otherwise (n,)."""
        found = [self.find(text) for text in column.texts()]
        position = np.array([p for p, _exact in found] + [-1], dtype=np.int32)
        known = position[column.codes]
        otherwise = column.spread([p >= 0 and not exact for p, exact in found])
        if column.padded is not None:
            otherwise = otherwise | (column.padded & (known >= 0))
        return known, otherwise


def code_index(codes: list[str]) -> CodeIndex:
    """Index of known codes; loose forms that two codes share are left out."""

    def unique(forms: list[str]) -> dict[str, int]:
        seen: dict[str, int] = {}
        for k, form in enumerate(forms):
            seen[form] = -1 if form in seen else k
        return {form: k for form, k in seen.items() if k >= 0}

    return CodeIndex(
        {code: k for k, code in enumerate(codes)},
        unique([_loose(code) for code in codes]),
        unique([_bare(code) for code in codes]),
    )
