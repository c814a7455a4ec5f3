"""Whether the arrays of a plan file fit together: lengths of every axis, positions inside their axis."""

from __future__ import annotations

import numpy as np

from planner.base.errors import CallError
from planner.base.text import _
from planner.catalogue.items import Catalogue
from planner.demand.fitted import FittedModel
from planner.demand.store_demand import StoreDemand
from planner.plan.plans import States
from planner.planfile.contents import PlanContents
from planner.planfile.damage import Damage
from planner.sales.panel import BaseWeek, MarketPanel

# Axes of every array: J items, S stores, C clusters, G segments, T markets, K draws.
_AXES: dict[type, dict[str, str]] = {
    MarketPanel: {
        "store_index": "T", "week_index": "T", "units": "TJ", "listed": "TJ", "on_sale": "TJ",
        "regular_price": "TJ", "price": "TJ", "promotion": "TJ", "display": "TJ", "shoppers": "T",
    },
    BaseWeek: {
        "today": "SJ", "units": "SJ", "price": "CJ", "cost": "J", "margin": "CJ", "net_price": "CJ",
        "shoppers": "S", "space_cm": "J", "space_limit": "S",
    },
    StoreDemand: {
        "attraction": "KCJ", "dissimilarity": "KG", "category_dissimilarity": "K", "scale": "KS",
        "segment": "J", "cluster": "S", "shoppers": "S",
    },
}  # fmt: skip
# Positions and the axis they point into (W weeks).
_POSITIONS: dict[type, dict[str, str]] = {
    MarketPanel: {"store_index": "S", "week_index": "W"},
    StoreDemand: {"segment": "G", "cluster": "C"},
}


def _check_axes(record: object, sizes: dict[str, int]) -> None:
    """Compare every array with the known axis lengths; unknown ones are learnt.  Raises Damage."""
    kind = type(record)
    for name, axes in _AXES[kind].items():
        array = getattr(record, name)
        if array is None:
            continue
        if array.ndim != len(axes):
            raise Damage(f"{kind.__name__}.{name} has {array.ndim} axes, not {len(axes)}")
        for axis, length in zip(axes, array.shape, strict=True):
            if sizes.setdefault(axis, length) != length:
                raise Damage(f"{kind.__name__}.{name} has {length} places on axis {axis}, not {sizes[axis]}")
    for name, axis in _POSITIONS.get(kind, {}).items():
        array = getattr(record, name)
        if array.dtype.kind not in "iu" or (array.size and not 0 <= array.min() <= array.max() < sizes[axis]):
            raise Damage(f"{kind.__name__}.{name} points outside its axis")


def _check_states(states: States, sizes: dict[str, int], what: str) -> None:
    if states.ndim != 2 or states.dtype != np.int8 or not np.isin(states, (0, 1, 2)).all():
        raise Damage(f"{what} is not made of the states 0, 1, 2")
    for axis, length in zip("CJ", states.shape, strict=True):
        if sizes.setdefault(axis, length) != length:
            raise Damage(f"{what} has {length} places on axis {axis}, not {sizes[axis]}")


def _sizes_of(catalogue: Catalogue) -> dict[str, int]:
    return {
        "J": len(catalogue.items),
        "S": len(catalogue.stores),
        "C": len(catalogue.clusters),
        "G": len(catalogue.segments),
    }


def _check_fit(fitted: FittedModel, sizes: dict[str, int]) -> None:
    for demand in (fitted.estimate, fitted.draws):
        own = {axis: length for axis, length in sizes.items() if axis != "K"}
        own["K"] = demand.attraction.shape[0] if demand.attraction.ndim else 0
        _check_axes(demand, own)
        if demand.price_effect.ndim != 2:
            raise Damage("StoreDemand.price_effect has another number of axes than 2")
        sizes.update({axis: length for axis, length in own.items() if axis != "K"})


def check_shapes(contents: PlanContents) -> None:
    """Raise Damage when arrays, states and plans do not fit each other."""
    sizes: dict[str, int] = {}
    if contents.loaded is not None:
        sizes = _sizes_of(contents.loaded.catalogue)
        sizes["W"] = len(contents.loaded.panel.weeks)
        _check_axes(contents.loaded.panel, sizes)
        _check_axes(contents.loaded.base, sizes)
    if contents.fitted is not None:
        _check_fit(contents.fitted, sizes)
    if contents.states is not None:
        _check_states(contents.states, sizes, "the plan")
    for plan in contents.plans:
        _check_states(plan.states, sizes, f"plan {plan.name!r}")
        for rung in plan.rungs:
            _check_states(rung.states, sizes, f"a rung of plan {plan.name!r}")


def refuse_unfit(contents: PlanContents) -> None:
    """Raise CallError instead of writing a file that could not be read back."""
    try:
        check_shapes(contents)
    except Damage as error:
        raise CallError(
            _("the review does not fit together and is not saved: {reason}.").format(reason=error)
        ) from error
