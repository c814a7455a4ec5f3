"""Who gets the sales: receivers one by one, own label, brands and suppliers summed, and what leaves."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from planner.base.errors import CallError
from planner.base.text import _
from planner.catalogue.items import Item
from planner.tables.build import flag, number, percent, text
from planner.tables.effects import Bools, Effects, Floats, changed_by_units, effects_of
from planner.tables.format import sensible_decimals
from planner.tables.table import Table
from planner.transfer.what_if import WhatIf

if TYPE_CHECKING:
    from planner.sales.report import LoadedData

MEASURES = ("units", "content", "money")
# How a row is meant: an item that changes itself, a receiver, sums over receivers, the rest.
KINDS = ("changed", "item", "own label", "brand", "supplier", "leaves")


def measure_weight(loaded: LoadedData, measure: str) -> tuple[Floats, str]:
    """(weight (C, J) of one unit, its unit in words).  Raises CallError for an unknown measure."""
    shape = loaded.base.net_price.shape
    if measure == "units":
        return np.ones(shape), _("units a week")
    if measure == "money":
        return np.nan_to_num(loaded.base.net_price), _("money a week, without VAT")
    if measure == "content":
        content = np.array([item.content for item in loaded.catalogue.items])
        names = sorted({item.content_unit for item in loaded.catalogue.items if item.content > 0.0})
        unit = names[0] if len(names) == 1 else _("content")
        return np.broadcast_to(content, shape).copy(), _("{unit} a week").format(unit=unit or _("content"))
    raise CallError(
        _("'{measure}' is not a measure.").format(measure=measure),
        remedy=_("Use one of: {names}.").format(names=", ".join(MEASURES)),
    )


def cluster_positions(clusters: Sequence[str], cluster: str | None) -> list[int]:
    """Positions of one cluster, or of all when None.  Raises CallError for an unknown one."""
    if cluster is None:
        return list(range(len(clusters)))
    if cluster not in clusters:
        raise CallError(
            _("there is no cluster '{name}'.").format(name=cluster),
            remedy=_("The clusters are: {names}.").format(names=", ".join(clusters)),
        )
    return [list(clusters).index(cluster)]


def _sums(items: Sequence[Item], receiving: Bools) -> list[tuple[str, str, Floats]]:
    """(kind, name, membership (J,)) of own label and the rest, every brand and every supplier."""
    mask = receiving.astype(np.float64)
    own = np.array([item.own_label for item in items], dtype=np.float64)
    found: list[tuple[str, str, Floats]] = []
    if own.any():
        found += [("own label", _("Own label"), own * mask), ("own label", _("Brands"), (1.0 - own) * mask)]
    for kind, names in (("brand", [i.brand for i in items]), ("supplier", [i.supplier for i in items])):
        for name in sorted({n for n in names if n}):
            found.append((kind, name, np.array([n == name for n in names], dtype=np.float64) * mask))
    return found


def receivers_table(
    loaded: LoadedData,
    effects: WhatIf,
    measure: str = "units",
    changed: Bools | None = None,
    cluster: str | None = None,
) -> Table:
    """Receivers of a change set, largest gain first, then sums and what leaves the category.

    changed (C, J): the changed items; None: those that sell on one side only.  cluster: one
    cluster's code, None for all.  Sums of own label, brands and suppliers leave out the changed items, so
    that own label, brands and what leaves add up to what the changed items lose.
    Raises CallError for an unknown measure or cluster.
    """
    items = loaded.catalogue.items
    weight, unit = measure_weight(loaded, measure)
    picked = cluster_positions(loaded.catalogue.clusters, cluster)
    moved = changed_by_units(effects) if changed is None else changed
    own: Bools = np.asarray(moved[picked].any(axis=0))
    sums = _sums(items, ~own)
    n = len(items)
    groups = np.vstack([np.eye(n), *[mask[None] for _k, _n, mask in sums], -np.ones((1, n))])
    found = effects_of(effects, moved, groups, picked, weight)
    active = [j for j in range(n) if own[j] or found.before[j] > 0.0 or found.after[j] > 0.0]
    active.sort(key=lambda j: (not own[j], -float(found.change[j]), items[j].code))
    order = [*active, *_ordered_sums(sums, found, n), n + len(sums)]
    return _table(items, own, sums, found, order, unit, _notes(loaded, measure, active))


def _ordered_sums(sums: list[tuple[str, str, Floats]], found: Effects, n: int) -> list[int]:
    """Sums kind by kind, largest gain first inside a kind."""
    rows = [k for k in range(len(sums)) if sums[k][2].any()]
    rows.sort(key=lambda k: (KINDS.index(sums[k][0]), -float(found.change[n + k]), sums[k][1]))
    return [n + k for k in rows]


def _notes(loaded: LoadedData, measure: str, active: list[int]) -> tuple[str, ...]:
    notes = [_("Share: part of what the changed items gain and lose themselves; 80 % intervals.")]
    if measure == "content":
        items = loaded.catalogue.items
        blank = [items[j].code for j in active if items[j].content <= 0.0]
        if blank:
            notes.append(
                _("Content is unknown for {n} items and counts as 0: {names}.").format(
                    n=len(blank), names=", ".join(blank[:8])
                )
            )
        if len({items[j].content_unit for j in active if items[j].content > 0.0}) > 1:
            notes.append(_("Items have contents in different units; their sum mixes them."))
    return tuple(notes)


def _table(
    items: Sequence[Item],
    own: Bools,
    sums: list[tuple[str, str, Floats]],
    found: Effects,
    order: list[int],
    unit: str,
    notes: tuple[str, ...],
) -> Table:
    n = len(items)
    # Code, segment, brand, own label only make sense for single items.
    single = [items[k] if k < n else None for k in order]
    kinds, words = [], []
    for k, item in zip(order, single, strict=True):
        if item is not None:
            kinds.append("changed" if own[k] else "item")
            words.append(item.description or item.code)
        elif k < n + len(sums):
            kinds.append(sums[k - n][0])
            words.append(sums[k - n][1])
        else:
            kinds.append("leaves")
            comes = float(found.change[k]) < 0.0
            words.append(
                _("Leaves the category (negative: comes into it)") if comes else _("Leaves the category")
            )
    fine = sensible_decimals(np.abs(found.change[order]))
    # The last row, what leaves, has no level of its own.
    before, after = [*found.before[order[:-1]], None], [*found.after[order[:-1]], None]
    return Table(
        "receivers",
        _("Where sales go"),
        (
            text("kind", _("Kind"), kinds),
            text("item", _("Item"), [item.code if item else "" for item in single]),
            text("description", _("Receiver"), words),
            text("segment", _("Segment"), [item.segment if item else "" for item in single]),
            text("brand", _("Brand"), [item.brand if item else "" for item in single]),
            flag("own_label", _("Own label"), [item.own_label if item else None for item in single]),
            number("before", _("Today"), before, fine, unit),
            number("after", _("Plan"), after, fine, unit),
            number("change", _("Change"), found.change[order], fine, unit),
            number("low", _("Change, low"), found.low[order], fine, unit),
            number("high", _("Change, high"), found.high[order], fine, unit),
            percent("share", _("Share"), found.share[order], 1),
            percent("share_low", _("Share, low"), found.share_low[order], 1),
            percent("share_high", _("Share, high"), found.share_high[order], 1),
        ),
        notes,
    )
