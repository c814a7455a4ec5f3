"""A result table as an item model: formatted once per column, own order and mask arrays."""

from __future__ import annotations

import html
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QAbstractTableModel, QMimeData, QModelIndex, QPersistentModelIndex, Qt, Signal

from planner.base.text import _, ngettext
from planner.gui.models.cell_text import texts_of
from planner.gui.theme.cells import Cell, CellBar
from planner.gui.theme.numbers import MINUS
from planner.tables.table import Column, Table

Index = QModelIndex | QPersistentModelIndex
Role = Qt.ItemDataRole
_NUMERIC = ("count", "number", "money", "percent")
_NOWHERE = QModelIndex()
_FEW = 12


@dataclass(frozen=True)
class Look:
    """How one column is shown, where it differs from plain text.

    low, high: keys of the columns that hold the interval of a bar.
    check: key of the column with the state of the box (True, False, None = in between).
    """

    title: str = ""
    tip: str = ""
    bar: bool = False
    low: str = ""
    high: str = ""
    check: str = ""
    editable: bool = False


@dataclass
class _Shown:
    """A column with its texts, made once."""

    column: Column
    look: Look
    texts: list[str]
    bars: list[CellBar | None]


def _floats(values: Sequence[object]) -> NDArray[np.float64]:
    return np.array(
        [math.nan if v is None else float(v) for v in values],  # type: ignore[arg-type]
        dtype=np.float64,
    )


class TableModel(QAbstractTableModel):
    """Rows of a Table in the user's order.

    identity: column that tells rows apart; group: column whose values become heading rows;
    shown: keys of the columns, in order (None: all that are not part of another column's look).
    checked(identity) is sent when a box is clicked, typed(identity, key, text) after editing.
    """

    checked = Signal(str)
    typed = Signal(str, str, str)

    def __init__(
        self,
        looks: Mapping[str, Look] | None = None,
        identity: str = "",
        group: str = "",
        shown: tuple[str, ...] | None = None,
        strong: str = "",
    ) -> None:
        super().__init__()
        self._looks = dict(looks or {})
        self._identity, self._group, self._wanted, self._strong = identity, group, shown, strong
        self._table = Table("", "", ())
        self._shown: list[_Shown] = []
        self._position: dict[str, int] = {}
        self._names: list[str] = []
        self._haystack: list[str] | None = None
        self._words: tuple[str, ...] = ()
        self._mask: NDArray[np.bool_] | None = None
        self._sorted_by: tuple[str, bool] | None = None
        # Source row per shown row; -1 - g marks the heading of group g.
        self._rows: NDArray[np.int64] = np.empty(0, dtype=np.int64)
        self._groups: list[str] = []
        self._group_sizes: list[int] = []

    # -- contents ------------------------------------------------------------------------

    def table(self) -> Table:
        """The table behind the model."""
        return self._table

    def set_table(self, table: Table) -> None:
        """Show ``table``; when only values changed, rows stay where they are."""
        if self._same_rows(table):
            self._update_columns(table)
            return
        self.beginResetModel()
        self._table = table
        self._shown = [self._made(column) for column in self._columns_of(table)]
        self._names = self._identities(table)
        self._position = {name: row for row, name in enumerate(self._names)}
        self._haystack = None
        if self._mask is not None and self._mask.size != table.n_rows:
            self._mask = None
        self._rows = self._arranged()
        self.endResetModel()

    def _identities(self, table: Table) -> list[str]:
        if self._identity and table.columns:
            return [str(value) for value in table.column(self._identity).values]
        return [str(row) for row in range(table.n_rows)]

    def _columns_of(self, table: Table) -> list[Column]:
        if self._wanted is not None:
            present = {column.key: column for column in table.columns}
            return [present[key] for key in self._wanted if key in present]
        hidden = {key for look in self._looks.values() for key in (look.low, look.high, look.check)}
        hidden.add(self._group)
        return [column for column in table.columns if column.key not in hidden]

    def _made(self, column: Column, table: Table | None = None) -> _Shown:
        look = self._looks.get(column.key, Look())
        bars: list[CellBar | None] = []
        if look.bar:
            bars = self._bars(column, look, table or self._table)
        return _Shown(column, look, texts_of(column), bars)

    @staticmethod
    def _bars(column: Column, look: Look, table: Table) -> list[CellBar | None]:
        value = _floats(column.values)
        nothing = np.full(value.size, math.nan)
        low = _floats(table.column(look.low).values) if look.low else nothing
        high = _floats(table.column(look.high).values) if look.high else nothing
        every = np.concatenate([value, low, high, [0.0]])
        every = every[np.isfinite(every)]
        bottom, top = float(every.min()), float(every.max())
        if top == bottom:
            top = bottom + 1.0
        longest = max(texts_of(column), key=len, default="")
        return [
            CellBar(float(v), float(a), float(b), bottom, top, longest) if math.isfinite(v) else None
            for v, a, b in zip(value, low, high, strict=True)
        ]

    def _same_rows(self, table: Table) -> bool:
        old = self._table
        if [c.key for c in old.columns] != [c.key for c in table.columns] or not table.columns:
            return False
        if [c.title for c in old.columns] != [c.title for c in table.columns]:
            return False
        if self._group and old.column(self._group).values != table.column(self._group).values:
            return False
        return self._identities(table) == self._names

    def _update_columns(self, table: Table) -> None:
        """Take changed values and tell of the rows they stand in; the rows keep their places."""
        changed: set[int] = set()
        keys: set[str] = set()
        for old, new in zip(self._table.columns, table.columns, strict=True):
            if new is not old:
                pairs = enumerate(zip(old.values, new.values, strict=True))
                rows = {row for row, (before, after) in pairs if before != after}
                changed |= rows
                keys |= {new.key} if rows else set()
        self._table = table
        self._haystack = None
        for position, shown in enumerate(self._shown):
            look, key = shown.look, shown.column.key
            if keys.intersection((key, look.low, look.high)):
                self._shown[position] = self._made(table.column(key), table)
                # Another scale or another width of the numbers moves every bar of the column.
                changed |= set(range(table.n_rows)) if look.bar else set()
        self._tell(changed)

    def _tell(self, sources: set[int]) -> None:
        """dataChanged for few rows one by one, for many at once: painting a row costs more than a signal."""
        rows = [row for row, source in enumerate(self._rows) if int(source) in sources]
        last = len(self._shown) - 1
        if not rows or last < 0:
            return
        rows_told = [(rows[0], rows[-1])] if len(rows) > _FEW else [(row, row) for row in rows]
        for first, final in rows_told:
            self.dataChanged.emit(self.index(first, 0), self.index(final, last))

    # -- order and mask --------------------------------------------------------------------

    def filter(self, text: str) -> None:
        """Show only rows that hold every word of ``text`` in some text column."""
        words = tuple(text.casefold().split())
        if words != self._words:
            self._words = words
            self._reset_rows()

    def set_mask(self, mask: NDArray[np.bool_] | None) -> None:
        """Show only source rows where ``mask`` is true (None: all)."""
        self._mask = mask
        self._reset_rows()

    def _reset_rows(self) -> None:
        self.beginResetModel()
        self._rows = self._arranged()
        self.endResetModel()

    def sort(self, column: int, order: Qt.SortOrder = Qt.SortOrder.AscendingOrder) -> None:
        """Sort by a shown column, inside each group; -1: the table's own order."""
        if column >= len(self._shown):
            return
        descending = order == Qt.SortOrder.DescendingOrder
        self._sorted_by = (self._shown[column].column.key, descending) if column >= 0 else None
        self.layoutAboutToBeChanged.emit()
        before = self.persistentIndexList()
        sources = [(int(self._rows[index.row()]), index.column()) for index in before]
        self._rows = self._arranged()
        place = {int(source): row for row, source in enumerate(self._rows)}
        after = [
            self.index(place[source], col) if source in place else QModelIndex() for source, col in sources
        ]
        self.changePersistentIndexList(before, after)
        self.layoutChanged.emit()

    def _kept(self) -> NDArray[np.bool_]:
        n = self._table.n_rows
        keep = np.ones(n, dtype=np.bool_) if self._mask is None else self._mask.copy()
        if self._words:
            if self._haystack is None:
                texts = [texts_of(c) for c in self._table.columns if c.kind == "text"]
                self._haystack = ["\n".join(row).casefold() for row in zip(*texts, strict=True)]
            hay = self._haystack or [""] * n
            keep &= np.array([all(word in row for word in self._words) for row in hay], dtype=np.bool_)
        return keep

    def _order(self) -> NDArray[np.int64]:
        n = self._table.n_rows
        if self._sorted_by is None:
            return np.arange(n)
        key, descending = self._sorted_by
        column = self._table.column(key)
        if column.kind in _NUMERIC:
            values = _floats(column.values)
            order = np.argsort(-values if descending else values, kind="stable")
            return order  # NaN stands last either way
        texts = [str(v).casefold() if v is not None else "" for v in column.values]
        by_text = sorted(range(n), key=lambda row: texts[row], reverse=descending)
        by_text.sort(key=lambda row: not texts[row])
        return np.array(by_text, dtype=np.int64)

    def _arranged(self) -> NDArray[np.int64]:
        keep = self._kept()
        order = self._order()
        order = order[keep[order]]
        if not self._group or not self._table.columns:
            return order
        labels = texts_of(self._table.column(self._group))
        self._groups = list(dict.fromkeys(labels))
        number = {label: g for g, label in enumerate(self._groups)}
        group = np.array([number[label] for label in labels], dtype=np.int64)
        parts: list[NDArray[np.int64]] = []
        self._group_sizes = [0] * len(self._groups)
        for g in range(len(self._groups)):
            members = order[group[order] == g]
            self._group_sizes[g] = int(members.size)
            if members.size:
                parts += [np.array([-1 - g], dtype=np.int64), members]
        return np.concatenate(parts) if parts else np.empty(0, dtype=np.int64)

    def heading_rows(self) -> list[int]:
        """Shown rows that name a group."""
        return [int(row) for row in np.flatnonzero(self._rows < 0)]

    def identity_of(self, row: int) -> str:
        """Identity of a shown row; empty for headings."""
        if not 0 <= row < self._rows.size or self._rows[row] < 0:
            return ""
        return self._names[int(self._rows[row])]

    def row_of(self, identity: str) -> int:
        """Shown row of an identity; -1 when it is not shown."""
        source = self._position.get(identity)
        if source is None:
            return -1
        found = np.flatnonzero(self._rows == source)
        return int(found[0]) if found.size else -1

    def column_of(self, key: str) -> int:
        """Shown position of a column; -1 when it is not shown."""
        return next((p for p, s in enumerate(self._shown) if s.column.key == key), -1)

    def keys(self) -> tuple[str, ...]:
        """Keys of the shown columns."""
        return tuple(shown.column.key for shown in self._shown)

    def titles_with_contents(self) -> tuple[tuple[str, bool], ...]:
        """Title of every shown column, and whether any row has a text there."""
        return tuple((self._title(shown), any(shown.texts)) for shown in self._shown)

    def column_width(self, position: int, measure: Callable[[str], int]) -> int:
        """A width in pixels that holds title and texts; ``measure`` gives the width of a text."""
        shown = self._shown[position]
        sample = sorted(set(shown.texts), key=len, reverse=True)[:5]
        text = min(max((measure(line) for line in sample), default=0), measure("n" * 40)) + 16
        if shown.look.check:
            text += 22
        if shown.look.bar:
            text += 72
        title = max(measure(line) for line in two_lines(self._title(shown)).split("\n")) + 18
        return max(text, title)

    # -- Qt's side -----------------------------------------------------------------------------

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else int(self._rows.size)

    def columnCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(self._shown)

    def cell(self, row: int, position: int) -> Cell:
        """Everything the delegate paints in one cell."""
        source = int(self._rows[row])
        if source < 0:
            return Cell(self._heading(-1 - source) if position == 0 else "", heading=True)
        shown = self._shown[position]
        strong = bool(self._strong and self._table.column(self._strong).values[source])
        return Cell(
            text=shown.texts[source],
            right=shown.column.kind in _NUMERIC,
            bar=shown.bars[source] if shown.bars else None,
            check=self._check(shown.look, source),
            strong=strong,
            editable=shown.look.editable,
        )

    def _heading(self, group: int) -> str:
        count = self._group_sizes[group]
        name = self._groups[group] or _("(no segment)")
        return ngettext("{name}  ·  {count} item", "{name}  ·  {count} items", count).format(
            name=name, count=count
        )

    def _check(self, look: Look, source: int) -> Qt.CheckState | None:
        if not look.check:
            return None
        value = self._table.column(look.check).values[source]
        if value is None:
            return Qt.CheckState.PartiallyChecked
        return Qt.CheckState.Checked if value else Qt.CheckState.Unchecked

    def data(self, index: Index, role: int = Role.DisplayRole) -> object:
        if not index.isValid():
            return None
        cell = self.cell(index.row(), index.column())
        if role in (Role.DisplayRole, Role.EditRole):
            return cell.text
        if role == Role.TextAlignmentRole:
            side = Qt.AlignmentFlag.AlignRight if cell.right else Qt.AlignmentFlag.AlignLeft
            return int(side | Qt.AlignmentFlag.AlignVCenter)
        if role == Role.CheckStateRole:
            return cell.check
        if role == Role.ToolTipRole:
            return cell.text if len(cell.text) > 24 else None
        if role == Role.AccessibleTextRole:
            return cell.text if cell.heading else f"{self._title(self._shown[index.column()])}: {cell.text}"
        return None

    def setData(self, index: Index, value: object, role: int = Role.EditRole) -> bool:
        """Edits go to the review, which answers with a new table."""
        identity = self.identity_of(index.row())
        if not identity:
            return False
        shown = self._shown[index.column()]
        if role == Role.CheckStateRole and shown.look.check:
            self.checked.emit(identity)
            return True
        if role == Role.EditRole and shown.look.editable:
            self.typed.emit(identity, shown.column.key, str(value).strip())
            return True
        return False

    @staticmethod
    def _title(shown: _Shown) -> str:
        title = shown.look.title or shown.column.title
        unit = shown.column.unit
        return _("{title} ({unit})").format(title=title, unit=unit) if unit else title

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = Role.DisplayRole) -> object:
        if orientation != Qt.Orientation.Horizontal or section >= len(self._shown):
            return None
        shown = self._shown[section]
        if role == Role.DisplayRole:
            return two_lines(self._title(shown))
        if role == Role.AccessibleTextRole:
            return self._title(shown)
        if role == Role.ToolTipRole:
            return shown.look.tip or self._title(shown)
        if role == Role.TextAlignmentRole:
            right = shown.column.kind in _NUMERIC and not shown.look.bar
            side = Qt.AlignmentFlag.AlignRight if right else Qt.AlignmentFlag.AlignLeft
            return int(side | Qt.AlignmentFlag.AlignVCenter)
        return None

    def flags(self, index: Index) -> Qt.ItemFlag:
        if not index.isValid():
            return Qt.ItemFlag.NoItemFlags
        if self._rows[index.row()] < 0:
            return Qt.ItemFlag.ItemIsEnabled
        flags = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable
        look = self._shown[index.column()].look
        if look.check:
            flags |= Qt.ItemFlag.ItemIsUserCheckable
        if look.editable:
            flags |= Qt.ItemFlag.ItemIsEditable
        return flags

    # -- copying -------------------------------------------------------------------------------

    def mimeData(self, indexes: Sequence[QModelIndex]) -> QMimeData:
        """The rows and columns of ``indexes`` as TSV and HTML, titles first; none: everything."""
        rows = sorted({index.row() for index in indexes}) or list(range(self._rows.size))
        columns = sorted({index.column() for index in indexes}) or list(range(len(self._shown)))
        lines = [[self._title(self._shown[c]) for c in columns]]
        for row in rows:
            cells = [self.cell(row, c) for c in columns]
            lines.append([cell.text for cell in cells])
        return table_mime(lines)


def two_lines(title: str) -> str:
    """A long title broken at the space nearest to its middle."""
    spaces = [at for at, letter in enumerate(title) if letter == " "]
    if len(title) <= 9 or not spaces:
        return title
    at = min(spaces, key=lambda place: abs(place - len(title) / 2))
    return title[:at] + "\n" + title[at + 1 :]


def _plain(text: str) -> str:
    """A text that a spreadsheet takes as text, on one line."""
    flat = " ".join(text.split()).replace(MINUS, "-")
    formula = flat[:1] in ("=", "@") or (flat[:1] in ("+", "-") and not flat[1:2].isdigit())
    return "'" + flat if formula else flat


def table_mime(lines: list[list[str]]) -> QMimeData:
    """Lines of cells (titles first) for the clipboard."""
    data = QMimeData()
    data.setText("\n".join("\t".join(_plain(cell) for cell in line) for line in lines) + "\n")
    head = "".join(f"<th>{html.escape(cell)}</th>" for cell in lines[0])
    body = "".join(
        "<tr>" + "".join(f"<td>{html.escape(_plain(cell))}</td>" for cell in line) + "</tr>"
        for line in lines[1:]
    )
    data.setHtml(f"<table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>")
    return data
