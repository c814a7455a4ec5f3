"""Column matches as one line of text: table.column=name in the file, with commas between."""

from __future__ import annotations

from collections.abc import Sequence

from planner.base.errors import CallError
from planner.base.text import _

Match = tuple[str, str, str]


def read_matches(text: str) -> tuple[Match, ...]:
    """The matches in ``text``.  Raises CallError for a part that has another form."""
    found: list[Match] = []
    for part in (piece.strip() for piece in text.split(",")):
        if not part:
            continue
        ours, sign, theirs = part.partition("=")
        table, dot, column = ours.strip().partition(".")
        if not (sign and dot and table and column and theirs.strip()):
            raise CallError(
                _("“{part}” is not of the form table.column=name in the file.").format(part=part),
                place=_("column matches on the Sales page"),
                remedy=_("Write for instance sales.units=qty, with commas between."),
            )
        found.append((table.strip(), column.strip(), theirs.strip()))
    return tuple(found)


def write_matches(matches: Sequence[Match]) -> str:
    """The text that ``read_matches`` reads."""
    return ", ".join(f"{table}.{column}={theirs}" for table, column, theirs in matches)
