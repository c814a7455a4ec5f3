"""GTIN check digits (GS1 General Specifications: weights 3 and 1 from the right)."""

from __future__ import annotations

LENGTHS = (8, 12, 13, 14)


def check_digit(body: str) -> int:
    """The digit that completes ``body`` (digits without the check digit)."""
    weighted = sum(int(c) * (3 if k % 2 == 0 else 1) for k, c in enumerate(reversed(body)))
    return -weighted % 10


def is_valid(code: str) -> bool:
    """Whether a whole code of 8, 12, 13 or 14 digits ends in its check digit."""
    return len(code) in LENGTHS and code.isdecimal() and check_digit(code[:-1]) == int(code[-1])
