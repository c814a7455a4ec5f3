"""Which column of a file is which of ours: by name, or as the user said."""

from __future__ import annotations

import difflib
import re
import shlex
import unicodedata
from dataclasses import dataclass

import numpy as np

from planner.base.errors import DataError
from planner.base.text import _
from planner.sales.columns import RawTable, TextColumn
from planner.sales.request import LoadRequest
from planner.sales.synonyms import CHOICES, COLUMNS, CURRENCIES, DESCRIPTIVE, NEEDED


@dataclass(frozen=True)
class Matched:
    """A table with its columns matched.

    names: our column -> their header.  choices: answers about meaning ("date_order": "dmy").
    """

    raw: RawTable
    names: dict[str, str]
    choices: dict[str, str]

    def has(self, ours: str) -> bool:
        """Whether the file holds this column of ours."""
        return ours in self.names

    def column(self, ours: str) -> TextColumn:
        """The cells of our column."""
        return self.raw.columns[self.names[ours]]

    def unmatched(self) -> list[str]:
        """Headers that are none of our columns."""
        taken = set(self.names.values())
        return [header for header in self.raw.columns if header not in taken]

    def place(self, ours: str) -> str:
        """File and column, for messages."""
        return _("{file}, column '{column}'").format(file=self.raw.file, column=self.names[ours])


def plain(name: str) -> str:
    """A name without case, accents, spaces and punctuation."""
    folded = unicodedata.normalize("NFKD", name.casefold())
    return re.sub(r"[\W_]+", "", "".join(c for c in folded if not unicodedata.combining(c)))


def _forms(header: str) -> list[str]:
    """The header's plain form, then without brackets, then without currency words."""
    bare = re.sub(r"[(\[].*?[)\]]", " ", header)
    spaced = re.sub(r"(?<=[a-z])(?=[A-Z])", " ", bare)
    words = [w for w in re.split(r"[\W_]+", spaced.casefold()) if w]
    without = [w for w in words if w not in CURRENCIES]
    forms = [plain(header), plain(bare), "".join(without)]
    return [form for k, form in enumerate(forms) if form and form not in forms[:k]]


def match(raw: RawTable, request: LoadRequest) -> Matched:
    """Match the columns of a table.

    Raises DataError naming the file, its columns, what was expected and the option that
    answers, when a needed column is missing or two columns have an equal claim.
    """
    given = {ours: theirs for table, ours, theirs in request.matches if table == raw.name}
    general = {ours: theirs for table, ours, theirs in request.matches if table == "sales"}
    choices = {k: given.get(k, general.get(k, "")) for k in CHOICES if k in given or k in general}
    known = COLUMNS[raw.name]
    names: dict[str, str] = {}
    for ours, theirs in given.items():
        if ours in CHOICES:
            continue
        names[_known_column(ours, raw)] = _their_header(theirs, ours, raw)
    for ours, tiers in known.items():
        if ours in names:
            continue
        found = _by_name(ours, tiers, raw, set(names.values()))
        if found:
            names[ours] = found
    _check_needed(raw, names)
    return Matched(raw, names, choices)


def _known_column(ours: str, raw: RawTable) -> str:
    if ours in COLUMNS[raw.name]:
        return ours
    close = difflib.get_close_matches(ours, [*COLUMNS[raw.name], *CHOICES], n=1)
    raise DataError(
        _("'{table}.{ours}' is not a column this program knows.").format(table=raw.name, ours=ours),
        place=raw.file,
        remedy=(_("Did you mean '{close}'? ").format(close=close[0]) if close else "")
        + _("Columns of {table}: {columns}.").format(
            table=raw.name, columns=", ".join([*COLUMNS[raw.name], *CHOICES])
        ),
    )


def _their_header(theirs: str, ours: str, raw: RawTable) -> str:
    if theirs in raw.columns:
        return theirs
    alike = [header for header in raw.columns if plain(header) == plain(theirs)]
    if len(alike) == 1:
        return alike[0]
    raise DataError(
        _(
            "there is no column '{theirs}' to take as {table}.{ours}; the file's columns are: {columns}."
        ).format(theirs=theirs, table=raw.name, ours=ours, columns=raw.headers()),
        place=raw.file,
        remedy=_("Correct --match {table}.{ours}=NAME.").format(table=raw.name, ours=ours),
    )


def _by_name(ours: str, tiers: tuple[str, ...], raw: RawTable, taken: set[str]) -> str:
    free = [header for header in raw.columns if header not in taken]
    forms = {header: _forms(header) for header in free}
    for tier in tiers:
        names = {plain(name): k for k, name in enumerate(tier.split())}
        for depth in range(3):
            found = [h for h in free if len(forms[h]) > depth and forms[h][depth] in names]
            if ours in DESCRIPTIVE:
                found.sort(key=lambda h, depth=depth: names[forms[h][depth]])  # type: ignore[misc]
            elif len(found) > 1 and not _equal_cells(raw, found):
                raise DataError(
                    _(
                        "columns {rivals} could each be {table}.{ours}; the file's columns are: {columns}."
                    ).format(
                        rivals=" and ".join(f"'{h}'" for h in found),
                        table=raw.name,
                        ours=ours,
                        columns=raw.headers(),
                    ),
                    place=raw.file,
                    remedy=_("Say which one with --match {table}.{ours}={rival}.").format(
                        table=raw.name, ours=ours, rival=shlex.quote(found[0])
                    ),
                )
            if found:
                return found[0]
    return ""


def _equal_cells(raw: RawTable, headers: list[str]) -> bool:
    """Rivals with the same cells throughout are no question."""
    first = raw.columns[headers[0]]
    for header in headers[1:]:
        other = raw.columns[header]
        if first.texts() != other.texts() or not np.array_equal(first.codes, other.codes):
            return False
    return True


def _check_needed(raw: RawTable, names: dict[str, str]) -> None:
    for group in NEEDED[raw.name]:
        if any(ours in names for ours in group):
            continue
        expected = " | ".join(group)
        examples = ", ".join(COLUMNS[raw.name][group[0]][0].split()[:6])
        raise DataError(
            _(
                "no column was recognised as {expected}; the file's columns are: {columns}. "
                "Expected a name such as {examples}."
            ).format(expected=expected, columns=raw.headers(), examples=examples),
            place=raw.file,
            remedy=_("Say which column it is with --match {table}.{ours}=NAME.").format(
                table=raw.name, ours=group[0]
            ),
        )
