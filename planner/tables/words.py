"""Plain sentences about the evidence: what the history cannot tell, how closed segments are, prices."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.base.text import _, ngettext
from planner.plan.plans import States
from planner.tables.effects import Floats
from planner.tables.format import number, percent, percent_span, span
from planner.tables.names import cluster_name
from planner.tables.plan import cluster_of
from planner.transfer.what_if import interval, presence

if TYPE_CHECKING:
    from planner.demand.fitted import FittedModel, SegmentFinding
    from planner.demand.store_demand import StoreDemand
    from planner.evidence.history import History
    from planner.sales.report import LoadedData
    from planner.transfer.delistings import DelistingTransfers

# Below these, the words say that the history holds too little to tell.
FEW_CHANGES = 5
STILL_PRICES = 0.01
FEW_STORES = 5
PRICE_STEP = 0.01
# Ranges so much shorter or longer than ever before are called out.
BEYOND = 0.1


def cautions() -> tuple[str, ...]:
    """What stands beside every result."""
    return (
        _(
            "All figures are estimates of averages from this chain's own past. They do not cover what never "
            "varied in it, shoppers who leave the shop altogether, or what suppliers and competitors do next."
        ),
        _(
            "A delisting may fall under supply contracts, notice periods, or the grocery supply code and "
            "competition law of the country. Ask those who are licensed to judge that before acting."
        ),
        _(
            "Some items are kept for reasons other than margin: infant formula, foods free of allergens, "
            "medicines. Lock them as keep."
        ),
    )


def beyond_history(loaded: LoadedData, states: States) -> str:
    """A sentence when a plan's range is shorter or longer than stores ever had it; else "".

    A store counts when its number of items in the plan lies more than a tenth outside what its own
    weeks of the history held.
    """
    panel, base = loaded.panel, loaded.base
    listed = panel.listed.sum(axis=1)
    of_store = [listed[panel.store_index == s] for s in range(len(loaded.catalogue.stores))]
    low = np.array([weeks.min() if weeks.size else 0 for weeks in of_store])
    high = np.array([weeks.max() if weeks.size else 0 for weeks in of_store])
    planned = presence(states, base.today, cluster_of(loaded)).sum(axis=1)
    outside = (planned < (1.0 - BEYOND) * low) | (planned > (1.0 + BEYOND) * high)
    if not outside.any():
        return ""
    return _(
        "In {n} of {all} stores the plan's number of items ({planned}) lies outside anything the history "
        "holds there ({held}): the estimate extrapolates, and its interval does not cover that."
    ).format(
        n=int(outside.sum()),
        all=outside.size,
        planned=_from_to(planned[outside], planned[outside]),
        held=_from_to(low[outside], high[outside]),
    )


def _from_to(low: NDArray[np.int64], high: NDArray[np.int64]) -> str:
    least, most = float(low.min()), float(high.max())
    return number(least) if least == most else span(least, most)


def notes(loaded: LoadedData, fitted: FittedModel | None) -> tuple[str, ...]:
    """Everything that was assumed on the way, once each: loading, base week, fit."""
    said = (*loaded.report.notes, *loaded.base.notes, *(fitted.notes if fitted else ()))
    return tuple(dict.fromkeys(said))


def _names(names: Sequence[str], most: int = 6) -> str:
    shown = ", ".join(names[:most])
    if len(names) <= most:
        return shown
    return _("{names} and {n} more").format(names=shown, n=len(names) - most)


def _silent_segments(loaded: LoadedData, fitted: FittedModel, history: History) -> list[str]:
    """Segments about which this history is silent, and what stands in for it."""
    said = []
    unsold = [f.segment for f in fitted.segments if f.items == 0]
    single = [f.segment for f in fitted.segments if f.items == 1]
    # Switching inside a segment of one item is no question of evidence.
    few = [f.segment for f in fitted.segments if f.items > 1 and f.events < FEW_CHANGES]
    if fitted.model == "plain":
        said.append(
            _(
                "The plain model does not ask how closed segments are: it assumes that lost sales spread "
                "over all items in proportion to what they sell. Fit the nested model to let the history "
                "speak."
            )
        )
    elif few:
        said.append(
            _(
                "Too little changed on the list to tell how closed these segments are (fewer than {n} "
                "listing changes each): {names}. There the figures lean on the default, the mean of the "
                "other segments."
            ).format(n=FEW_CHANGES, names=_names(few))
        )
    if single:
        said.append(
            _("With one item there is nothing to switch to inside: {names}.").format(names=_names(single))
        )
    if unsold:
        said.append(
            _("Nothing was sold yet in: {names}. How an offer there switches is the default.").format(
                names=_names(unsold)
            )
        )
    still = [
        name
        for name, moved in zip(loaded.catalogue.segments, history.price_variation, strict=True)
        if moved < STILL_PRICES and name not in unsold
    ]
    if still:
        said.append(
            _(
                "Regular prices hardly moved, so the effect of a price change is weakly known: {names}."
            ).format(names=_names(still))
        )
    return said


def _thin_history(fitted: FittedModel, history: History) -> list[str]:
    """What the history as a whole is too small or too poor for."""
    said = []
    if not fitted.with_shoppers:
        said.append(
            _(
                "Shopper counts are not used: how much leaves the category is judged from how the "
                "category's volume moved when its range did (80 % interval of that exponent {span})."
            ).format(span=span(fitted.category_low, fitted.category_high, 2))
        )
    if history.stores < FEW_STORES:
        said.append(
            ngettext(
                "The history has only {n} store; standard errors from so few are rough.",
                "The history has only {n} stores; standard errors from so few are rough.",
                history.stores,
            ).format(n=history.stores)
        )
    if history.thin_items:
        said.append(
            ngettext(
                "{n} item sold less than 50 units in all; its figures lean on items like it.",
                "{n} items sold less than 50 units in all; their figures lean on items like them.",
                history.thin_items,
            ).format(n=history.thin_items)
        )
    return said


def stays_inside(moved: Floats, units: Floats, segment: NDArray[np.int64]) -> Floats:
    """(G,) part of an item's lost sales that items of its own segment receive, weighted by units.

    moved (J, J + 1), units (J,) as in DelistingTransfers; NaN where a segment sells nothing.
    """
    n = units.size
    sold = np.nan_to_num(units)
    gains = np.nan_to_num(moved[:, :n].copy())
    np.fill_diagonal(gains, 0.0)
    inside = (gains * (segment[:, None] == segment[None, :])).sum(axis=1)
    groups = int(segment.max()) + 1 if n else 0
    kept = np.bincount(segment, inside, minlength=groups)
    lost = np.bincount(segment, sold, minlength=groups)
    part: Floats = np.where(lost > 0.0, kept / np.where(lost > 0.0, lost, 1.0), np.nan)
    return part


def _weighted(values: Floats, weight: Floats) -> float:
    known = np.isfinite(values) & (weight > 0.0)
    if not known.any():
        return float("nan")
    return float((values[known] * weight[known]).sum() / weight[known].sum())


def _segment_words(
    finding: SegmentFinding, inside: float, stays: tuple[float, float, float], with_openness: bool
) -> str:
    text = _(
        "{segment}: of an item's lost sales an estimated {inside} goes to items of the segment and {stays} "
        "stays in the category (typical 80 % interval {interval})"
    ).format(
        segment=finding.segment,
        inside=percent(inside),
        stays=percent(stays[0]),
        interval=percent_span(stays[1], stays[2]),
    )
    changes = ngettext("{n} listing change", "{n} listing changes", finding.events).format(n=finding.events)
    if not with_openness:
        return _("{text}.").format(text=text)
    return _("{text}; {ratio} between closed (0) and open (1), 80 % interval {span}, from {changes}.").format(
        text=text, ratio=number(finding.ratio, 2), span=span(finding.low, finding.high, 2), changes=changes
    )


def _segments(loaded: LoadedData, fitted: FittedModel, delistings: DelistingTransfers) -> list[str]:
    segment = np.array(loaded.catalogue.segment_of_item(), dtype=np.int64)
    inside = stays_inside(delistings.moved, delistings.units, segment)
    weight = np.nan_to_num(delistings.units)
    said = []
    for finding in fitted.segments:
        if finding.items < 2 or finding.segment not in loaded.catalogue.segments:
            continue
        g = loaded.catalogue.segments.index(finding.segment)
        mine = np.where(segment == g, weight, 0.0)
        stays = (
            _weighted(delistings.stays, mine),
            _weighted(delistings.stays_low, mine),
            _weighted(delistings.stays_high, mine),
        )
        if np.isfinite(stays[0]):
            said.append(_segment_words(finding, float(inside[g]), stays, fitted.model != "plain"))
    return said


def own_price_response(loaded: LoadedData, fitted: FittedModel) -> float:
    """Mean relative change of an item's units when its own price alone rises by 1 %, weighted by units."""
    demand, base = fitted.estimate, loaded.base
    before = demand.units(base.today)[0].sum(axis=0)
    sold = np.flatnonzero(before > 0.0)
    change = 0.0
    for j in sold:
        ratio = np.ones_like(base.price)
        ratio[:, j] = 1.0 + PRICE_STEP
        change += float(demand.with_prices(ratio).units(base.today)[0][:, j].sum() - before[j])
    return change / float(before.sum()) if sold.size else float("nan")


def category_price_response(loaded: LoadedData, fitted: FittedModel) -> tuple[float, float, float]:
    """(estimate, low, high) of the relative change of category units when all prices rise by 1 %; 80 %."""
    base = loaded.base
    ratio = np.full_like(base.price, 1.0 + PRICE_STEP)

    def change(demand: StoreDemand) -> Floats:
        before = demand.category_units(base.today).sum(axis=1)
        after = demand.with_prices(ratio).category_units(base.today).sum(axis=1)
        part: Floats = after / before - 1.0
        return part

    low, high = interval(change(fitted.draws))
    return float(change(fitted.estimate)[0]), float(low), float(high)


def _prices(loaded: LoadedData, fitted: FittedModel) -> list[str]:
    own = own_price_response(loaded, fitted)
    if not np.isfinite(own):
        return []
    if not fitted.estimate.price_effect.any():
        return [_("Prices moved too little to estimate what a price change does; transfers ignore prices.")]
    every, low, high = category_price_response(loaded, fitted)
    said = _(
        "A price rise of 1 % on one item alone is estimated to change its own units by {own}; on all items "
        "at once, the category's units by {every} (80 % interval {span})."
    ).format(own=percent(own, 2, True), every=percent(every, 2, True), span=percent_span(low, high, 2))
    if own > 0.0:
        said += " " + _("A rise that sells more is not believable: do not use these price effects.")
    return [said]


def evidence_words(
    loaded: LoadedData, fitted: FittedModel, delistings: DelistingTransfers, history: History
) -> tuple[str, ...]:
    """Sentences for the Evidence page: first what the history cannot tell, then what it suggests."""
    changes = int(history.changes.sum())
    by_cluster = ", ".join(
        _("{cluster} {n}").format(cluster=cluster_name(name), n=int(n))
        for name, n in zip(loaded.catalogue.clusters, history.changes.sum(axis=0), strict=True)
    )
    said = [*_silent_segments(loaded, fitted, history), *_thin_history(fitted, history)]
    said.append(
        _(
            "{weeks} weeks, {stores} stores, {items} items sold; {changes} listings and delistings of single "
            "items in single stores ({by_cluster})."
        ).format(
            weeks=history.weeks,
            stores=history.stores,
            items=history.items_sold,
            changes=changes,
            by_cluster=by_cluster,
        )
    )
    said += _segments(loaded, fitted, delistings)
    said += _prices(loaded, fitted)
    said.append(
        _("These are averages over past changes, and other things changed then too; they prove nothing.")
    )
    return tuple(said)
