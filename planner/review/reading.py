"""The tables and sentences that views read from a review."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from planner.base.errors import CallError
from planner.base.text import _
from planner.plan.limits import ItemLock
from planner.review import engine
from planner.tables.bench import bench_table
from planner.tables.evidence import parameters_table, segments_table
from planner.tables.format import number, percent
from planner.tables.ladder import ladder_table
from planner.tables.limits import limits_table
from planner.tables.plan import item_list_table, plan_table, plans_compared_table
from planner.tables.receivers import receivers_table
from planner.tables.sales import checks_table, events_table, matches_table, reconciliation_table
from planner.tables.table import Table
from planner.tables.tally import tally_table
from planner.tables.words import cautions, evidence_words, notes
from planner.transfer.what_if import IN, OUT

if TYPE_CHECKING:
    from planner.review.review import RangeReview


def _receivers(
    review: RangeReview, item: str | None = None, measure: str = "units", cluster: str | None = None
) -> Table:
    """Where the sales of one delisted item, or of the whole plan in work, go."""
    loaded, states = review.need_loaded(), review.states
    if item is None:
        changed = review.today_states() != states
        return receivers_table(loaded, review.effects(), measure, changed, cluster)
    j = review.position(item)
    without = review.today_states()
    if (without[:, j] != OUT).any():
        without[:, j] = OUT
    else:
        # An item not sold today: whose sales it would take.
        without[review.open_to(j, list(range(len(without)))), j] = IN
    changed = review.today_states() != without
    return receivers_table(loaded, review.single_effects(without), measure, changed, cluster)


def _bench(review: RangeReview, cluster: str | None = None) -> Table:
    loaded = review.need_loaded()
    delistings = review.delistings() if review.fitted is not None else None
    states = review.states
    assert states is not None
    flags = tuple(ItemLock(item.code, "keep") for item in loaded.catalogue.items if item.keep)
    locks = (*review.limits.locks, *flags)
    return bench_table(loaded, review.fitted, delistings, states, locks, cluster)


def _plans(review: RangeReview) -> Table:
    tallies = [review.single_tally(kept.states) for kept in review.plans]
    return plans_compared_table(review.need_loaded(), review.plans, tallies)


def table(review: RangeReview, key: str, **choices: Any) -> Table:
    """The table called ``key``; CallError when there is none, or what it needs is missing."""
    builders: dict[str, Callable[[], Table]] = {
        "reconciliation": lambda: reconciliation_table(review.need_loaded().report),
        "checks": lambda: checks_table(review.need_loaded().report),
        "matches": lambda: matches_table(review.need_loaded().report),
        "events": lambda: events_table(review.need_loaded(), **choices),
        "segments": lambda: segments_table(review.need_fitted()),
        "parameters": lambda: parameters_table(review.need_fitted()),
        "bench": lambda: _bench(review, **choices),
        "receivers": lambda: _receivers(review, **choices),
        "plan": lambda: plan_table(review.need_loaded(), review.effects(), _states(review)),
        "items": lambda: item_list_table(
            review.need_loaded(), review.effects(), _states(review), review.reasons, **choices
        ),
        "ladder": lambda: ladder_table(review.need_loaded(), review.plan(choices.get("name")).rungs),
        "limits": lambda: limits_table(review.need_loaded(), review.limits, _states(review)),
        "plans": lambda: _plans(review),
        "tally": lambda: tally_table(review.need_loaded(), review.tally()),
    }
    if key not in builders:
        raise CallError(_("There is no table called '{key}'.").format(key=key))
    return builders[key]()


def _states(review: RangeReview) -> np.ndarray[Any, np.dtype[np.int8]]:
    review.need_loaded()
    assert review.states is not None
    return review.states


def evidence(review: RangeReview) -> tuple[str, ...]:
    """The Evidence page's sentences."""
    loaded, fitted = review.need_loaded(), review.need_fitted()
    return evidence_words(loaded, fitted, review.delistings(), engine.history_of(loaded))


def _model(review: RangeReview) -> tuple[str, ...]:
    """Which model and what it says of the average delisting, in a sentence or two."""
    loaded, fitted, found = review.need_loaded(), review.need_fitted(), review.delistings()
    units = np.nan_to_num(found.units)
    segment = np.array(loaded.catalogue.segment_of_item())

    def stays(mask: np.ndarray[Any, np.dtype[np.bool_]]) -> float:
        return float((np.nan_to_num(found.stays) * units)[mask].sum() / units[mask].sum())

    said = [
        _("{model}, {shoppers}, fitted in {seconds} s on {markets} store-weeks.").format(
            model=_("Plain share model") if fitted.model == "plain" else _("Nested share model"),
            shoppers=_("with shopper counts") if fitted.with_shoppers else _("without shopper counts"),
            seconds=number(fitted.seconds, 1),
            markets=number(loaded.panel.n_markets),
        )
    ]
    sold = [g for g in range(len(loaded.catalogue.segments)) if units[segment == g].sum() > 0.0]
    if sold:
        parts = sorted((stays(segment == g), loaded.catalogue.segments[g]) for g in sold)
        said.append(
            _(
                "When an item is delisted, an estimated {share} of its units stays in the category on "
                "average (from {low} in {first} to {high} in {last})."
            ).format(
                share=percent(stays(units > 0.0)),
                low=percent(parts[0][0]),
                first=parts[0][1],
                high=percent(parts[-1][0]),
                last=parts[-1][1],
            )
        )
    return tuple(said)


def words(review: RangeReview, key: str) -> tuple[str, ...]:
    """Sentences: "cautions", "notes", "model"; "evidence" is empty before a fit."""
    if key == "cautions":
        return cautions()
    if key == "notes":
        return notes(review.loaded, review.fitted) if review.loaded is not None else ()
    if key == "model":
        return _model(review)
    if key == "evidence":
        return ()
    raise CallError(_("There are no words called '{key}'.").format(key=key))
