"""What the share model found, as tables: how closed each segment is, parameters with their errors."""

from __future__ import annotations

from typing import TYPE_CHECKING

from planner.base.text import _
from planner.tables.build import count, number, text
from planner.tables.table import Table

if TYPE_CHECKING:
    from planner.demand.fitted import FittedModel


def segments_table(fitted: FittedModel) -> Table:
    """One row per segment: closure with its interval, and what in the history tells it.

    ratio: dissimilarity of the segment over that of the category, 1 = switching in proportion to sales.
    """
    found = fitted.segments
    return Table(
        "segments",
        _("Segments"),
        (
            text("segment", _("Segment"), [f.segment for f in found]),
            count("items", _("Items"), [f.items for f in found]),
            number("ratio", _("Closed 0, open 1"), [f.ratio for f in found], 2),
            number("low", _("Low"), [f.low for f in found], 2),
            number("high", _("High"), [f.high for f in found], 2),
            count("events", _("Listing changes"), [f.events for f in found]),
            number("spread", _("Spread"), [f.spread for f in found], 3),
            number("dissimilarity", _("Dissimilarity"), [f.dissimilarity for f in found], 3),
            number("standard_error", _("Standard error"), [f.standard_error for f in found], 3),
        ),
        (
            _("Open, 1: lost sales spread over all items in proportion. Closed, near 0: they stay inside."),
            _("Low and high: 80 % interval. Listing changes: counted item by item in single stores."),
            _("Spread: how much the segment's offer varied beyond store and week, in logarithms."),
        ),
    )


def parameters_table(fitted: FittedModel) -> Table:
    """Common parameters with standard errors."""
    found = fitted.parameters
    return Table(
        "parameters",
        _("Parameters"),
        (
            text("name", _("Parameter"), [p.name for p in found]),
            text("group", _("Group"), [p.group for p in found]),
            number("value", _("Estimate"), [p.value for p in found], 3),
            number("standard_error", _("Standard error"), [p.standard_error for p in found], 3),
        ),
        (
            _("Model: {model}. Log-likelihood {value:,.1f}; dispersion {dispersion:.2f}.").format(
                model=fitted.model, value=fitted.log_likelihood, dispersion=fitted.dispersion
            ),
            _("Dissimilarity of the category {value:.2f}, 80 % interval {low:.2f} to {high:.2f}.").format(
                value=fitted.category_dissimilarity, low=fitted.category_low, high=fitted.category_high
            ),
        ),
    )
