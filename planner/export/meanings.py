"""What every column of the workbook means, in plain words."""

from __future__ import annotations

from planner.base.text import _

_SHARED = {
    "cluster": _("Group of stores that share one plan."),
    "item": _("Code of the item, as text."),
    "description": _("Name of the item."),
    "segment": _("Part of the category whose items are closer to each other than to the rest."),
    "brand": _("Brand of the item."),
    "supplier": _("Supplier of the item."),
    "own_label": _("The item is the chain's own label."),
    "price": _("Regular consumer price per unit today, VAT included."),
    "low": _("Lower end of the 80 % interval of the change: one time in ten it is expected to lie below."),
    "high": _("Upper end of the 80 % interval of the change: one time in ten it is expected to lie above."),
    "words": _("What else is to know."),
}

_BY_TABLE = {
    "tally": {
        "measure": _("What is measured; money and units per week over all stores."),
        "today": _("Today's range in an ordinary week: regular prices, no promotions, everything on sale."),
        "plan": _("The plan in the same ordinary week, estimated."),
        "change": _("Plan less today."),
        "limit": _("Space of the store with the least room left."),
    },
    "item_list": {
        "action": _(
            "list: new in the cluster; extend: from some of its stores to all; withdraw: from some of its "
            "stores to none; delist: from all to none; keep: no change."
        ),
        "today": _("Part of the cluster's stores that list the item today."),
        "plan": _("in: in all stores of the cluster; out: in none; as today: in its present stores."),
        "space": _("Shelf space per store in the plan; 0 when out."),
        "units_today": _("Units a week in the cluster with today's range, ordinary week."),
        "units": _("Units a week in the cluster with the plan, estimated."),
        "units_change": _("Plan less today, with all changes of the plan together."),
        "sales": _("Money a week with the plan, without VAT."),
        "margin": _("Cash margin a week with the plan, without VAT; empty where the cost is unknown."),
        "reason": _("Why, as written by the people who decided."),
    },
    "receivers": {
        "kind": _(
            "changed: an item of the plan's changes; item: any other; then sums over the others by own "
            "label, brand and supplier; leaves: what leaves the category."
        ),
        "description": _("Who gains or loses."),
        "before": _("Units a week today."),
        "after": _("Units a week with the plan."),
        "change": _("Plan less today; what leaves the category counts as a gain of that row."),
        "share": _("Change over what the changed items gain and lose themselves."),
        "share_low": _("Lower end of the share's 80 % interval."),
        "share_high": _("Upper end of the share's 80 % interval."),
    },
    "bench": {
        "today": _("Part of all stores that list the item today."),
        "plan": _("The plan over all clusters; numbers count clusters."),
        "margin": _("Cash margin per unit without VAT, mean of the clusters."),
        "rate_of_sale": _("Units per store per week on sale, weeks without promotion, baseline window."),
        "rate_on_promotion": _("The same in weeks on promotion."),
        "units": _("Units a week over all stores, mean of the baseline window."),
        "space": _("Shelf space of the item as listed."),
        "stays": _("Part of the item's units that stays in the category if it alone is delisted everywhere."),
        "stays_low": _("Lower end of its 80 % interval."),
        "stays_high": _("Upper end of its 80 % interval."),
        "margin_lost": _(
            "Category margin a week that is lost if the item alone is delisted everywhere; negative: gained."
        ),
        "margin_lost_low": _("Lower end of its 80 % interval."),
        "margin_lost_high": _("Upper end of its 80 % interval."),
    },
    "ladder": {
        "changes": _("At most so many changes against today were allowed."),
        "made": _("So many were made."),
        "value": _("Goal a week of the best plan found, estimated."),
        "gain": _("Value less that of the first rung."),
        "bound": _("No plan with so many changes within the limits can be worth more under this model."),
        "gap": _("Bound less value, over value: what the search has left open."),
        "new": _("Changes that the rung before did not have."),
        "dropped": _("Changes of the rung before that this one does without."),
    },
    "limits": {
        "limit": _("What was limited."),
        "where": _("Cluster or item it holds for; empty: everywhere."),
        "value": _("The limit."),
        "used": _("How much of it the plan uses."),
        "room": _("What is left."),
        "met": _("Whether the plan keeps it."),
    },
    "reconciliation": {
        "what": _("Where rows and money of the sales file went."),
        "rows": _("Number of rows."),
        "money": _("Their money, exact."),
        "share": _("Part of the money read."),
    },
    "checks": {
        "check": _("What was looked for in the rows."),
        "rows": _("How often it was found."),
        "money": _("Money of these rows."),
        "share": _("Part of the money read."),
        "set_aside": _("Whether these rows are left out."),
        "treatment": _("What was done with them."),
        "examples": _("File, row and content of the first ones."),
    },
    "matches": {
        "table": _("Table that was loaded."),
        "column": _("Column of this program."),
        "their_name": _("Column of the file that was taken for it."),
    },
    "actions": {
        "list": _("Number of items newly listed."),
        "extend": _("Number of items extended from some stores to all."),
        "withdraw": _("Number of items withdrawn from their remaining stores."),
        "delist": _("Number of items delisted."),
    },
}


def meaning(table: str, column: str) -> str:
    """The words for one column.  Raises KeyError when there are none."""
    own = _BY_TABLE[table]
    return own[column] if column in own else _SHARED[column]


def model_words(model: str, with_shoppers: bool) -> tuple[str, ...]:
    """Which model stands behind the figures and what it does not cover."""
    which = (
        _(
            "Model: nested shares. Shoppers choose whether to buy in the category, then a segment, then an "
            "item; how closed segments are is estimated from past listings, delistings and stock-outs."
        )
        if model == "nested"
        else _(
            "Model: plain shares. Lost sales spread over all other items in proportion to what they sell; "
            "nothing about closer items was asked of the history."
        )
    )
    base = (
        _("What leaves the category is judged with the shopper counts that were loaded.")
        if with_shoppers
        else _("No shopper counts are used; what leaves the category is judged from the category's volume.")
    )
    return (
        which,
        base,
        _(
            "Today and plan are both the model's ordinary week, so promotions, stock-outs and season do not "
            "enter the difference. Changes are recomputed together, store by store, then summed."
        ),
        _(
            "Intervals come from parameter draws of this model: they carry what the history leaves open "
            "about its parameters, not a wrong model, and not what was never seen."
        ),
        _("A best plan is chosen on the estimate, which flatters it a little; lean on the interval."),
    )
