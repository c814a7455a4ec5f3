"""The receivers' table as rows of a bar list: what changes, the sums that matter, then each receiver."""

from __future__ import annotations

import math

from planner.base.text import _
from planner.gui.theme import numbers
from planner.gui.theme.cells import BarRow
from planner.tables.table import Table

# A mark beside the name, because colour alone should tell nothing.
_OWN = "◆"
# (kinds of rows, heading) in the order shown; sums stand high, so that nobody scrolls for them.
_SECTIONS = (("changed",), ("leaves", "own label"), ("item",), ("supplier",), ("brand",))


def _headings() -> tuple[str, ...]:
    return (
        _("Changed items"),
        _("Where their sales go, in all"),
        _("Item by item"),
        _("By supplier"),
        _("By brand"),
    )


def _number(value: object) -> float:
    return math.nan if value is None else float(value)  # type: ignore[arg-type]


def bar_rows(table: Table) -> tuple[BarRow, ...]:
    """One bar per row of the table "receivers", under headings."""
    kinds = [str(value) for value in table.column("kind").values]
    change = table.column("change")
    decimals = change.decimals
    columns = {key: table.column(key).values for key in ("item", "description", "segment", "own_label")}
    low, high = table.column("low").values, table.column("high").values
    rows: list[BarRow] = []
    for section, title in zip(_SECTIONS, _headings(), strict=True):
        inside = [row for row, kind in enumerate(kinds) if kind in section]
        inside.sort(key=lambda row: section.index(kinds[row]))
        if inside:
            rows.append(BarRow(title, kind="heading", note=_heading_note(section, change.unit)))
        for row in inside:
            value, bottom, top = _number(change.values[row]), _number(low[row]), _number(high[row])
            own = bool(columns["own_label"][row])
            rows.append(
                BarRow(
                    label=_label(kinds[row], str(columns["description"][row]), own),
                    value=value,
                    low=bottom,
                    high=top,
                    text=numbers.number(value, decimals, signed=True),
                    interval=numbers.span(bottom, top, decimals, signed=True),
                    kind=_kind(kinds[row], own),
                    identity=str(columns["item"][row]),
                    note=_("own label") if own else "",
                )
            )
    return tuple(rows)


def _kind(kind: str, own_label: bool) -> str:
    if kind == "leaves":
        return "leaves"
    if kind in ("own label", "brand", "supplier"):
        return "total"
    return "own" if own_label else "item"


def _heading_note(section: tuple[str, ...], unit: str) -> str:
    """The unit over the first rows, the sign of own label over the items."""
    if "item" in section:
        return _("{mark} own label").format(mark=_OWN)
    return unit if "changed" in section or "leaves" in section else ""


def _label(kind: str, words: str, own_label: bool) -> str:
    if kind == "leaves":
        return _("Leaves the category")
    return f"{_OWN} {words}" if own_label else words


def caption(table: Table, subject: str, today: bool) -> str:
    """What the bars say, in one sentence.  subject: the item, or "" for the whole plan;
    today: it is on a list today (else it would be listed)."""
    kinds = [str(value) for value in table.column("kind").values]
    leaves = kinds.index("leaves")
    share = _number(table.column("share").values[leaves])
    low, high = (_number(table.column(key).values[leaves]) for key in ("share_low", "share_high"))
    if not subject and "changed" not in kinds:
        return _("The plan is as today. Tick items in or out on the left.")
    if not subject:
        return _("All changes of the plan together, against today. Line: 80 % interval.")
    if not today:
        return _("If {item} were listed: whose sales it would take. Line: 80 % interval.").format(
            item=subject
        )
    stays = numbers.percent(1.0 - share)
    between = numbers.span(100.0 * (1.0 - high), 100.0 * (1.0 - low))
    return _(
        "If {item} alone left all stores, {stays} of its sales would stay in the category "
        "(80 % interval {between} %)."
    ).format(item=subject, stays=stays, between=between)
