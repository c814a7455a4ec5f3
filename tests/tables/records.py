"""A small review made by hand: 3 clusters, 6 stores, 8 items (the last an offer), 10 weeks."""

from __future__ import annotations

from dataclasses import replace
from datetime import date, timedelta
from decimal import Decimal
from pathlib import Path

import numpy as np
import pandas as pd

from planner.catalogue.items import Catalogue, Item, Store
from planner.demand.fitted import FittedModel, Parameter, SegmentFinding
from planner.demand.store_demand import StoreDemand
from planner.plan.limits import ClusterLimit, ItemLock, Limits
from planner.plan.plans import NamedPlan, PlanRung, SolverOutcome, States
from planner.sales.panel import BaseWeek, MarketPanel
from planner.sales.report import Check, ListingEvent, LoadedData, LoadReport
from planner.sales.request import LoadRequest
from planner.transfer.what_if import today_states

# Names that a spreadsheet would take for formulas.
TRICKY = ("=1+1", "+44 mint", "-20 % pack", "@home blend")

ITEMS = (
    Item("0101", "Green leaf 50", "Green", "Alder", "North Foods", content=50.0, content_unit="g",
         space_cm=8.0, vat_rate=0.2, cost=1.1),
    Item("0102", TRICKY[0], "Green", "Birch", "North Foods", content=100.0, content_unit="g",
         space_cm=10.0, vat_rate=0.2, cost=1.9),
    Item("0103", "House green", "Green", "House", "Own Mills", True, 80.0, "g", 9.0, 0.2, 0.9),
    Item("0104", TRICKY[1], "Green", "Alder", "North Foods", content=40.0, content_unit="g",
         space_cm=7.0, vat_rate=0.2, cost=1.3),
    Item("0201", TRICKY[2], "Herbal", "Birch", "North Foods", content=60.0, content_unit="g",
         space_cm=8.0, vat_rate=0.2, cost=1.2),
    Item("0202", TRICKY[3], "Herbal", "House", "Own Mills", True, 60.0, "g", 8.0, 0.2, 0.8),
    Item("0203", "Camomile 40", "Herbal", "Cedar", "West Trade", content=40.0, content_unit="g",
         space_cm=6.0, vat_rate=0.2, cost=1.0, keep=True),
    Item("0301", "Rooibos new", "Rooibos", "Cedar", "West Trade", content=50.0, content_unit="g",
         space_cm=7.0, vat_rate=0.2, cost=1.4, price=3.6, is_offer=True, offered_to=("Large",),
         attributes=(("organic", "yes"), ("bags", 20.0))),
)  # fmt: skip

STORES = (
    Store("S1", "Large", 62.0),
    Store("S2", "Large", 66.0),
    Store("S3", "Middle", 52.0),
    Store("S4", "Middle", 50.0),
    Store("S5", "Small", 40.0),
    Store("S6", "Small", None),
)

# Rows are stores, columns items: 0104 and 0202 are partly listed in some clusters.
TODAY = np.array(
    [
        [1, 1, 1, 1, 1, 1, 1, 0],
        [1, 1, 1, 1, 1, 1, 1, 0],
        [1, 1, 1, 1, 1, 0, 1, 0],
        [1, 1, 1, 0, 1, 1, 1, 0],
        [1, 0, 1, 0, 1, 0, 1, 0],
        [1, 0, 1, 0, 1, 1, 0, 0],
    ],
    dtype=bool,
)

WEEKS = tuple(date(2026, 1, 5) + timedelta(weeks=w) for w in range(10))


def catalogue() -> Catalogue:
    """Eight items in three segments, six stores in three clusters."""
    return Catalogue("Tea", ITEMS, STORES)


def demand(n_draws: int, spread: float, seed: int = 7) -> StoreDemand:
    """Nested demand around one estimate; spread 0 gives the estimate itself n_draws times."""
    rng = np.random.default_rng(seed)
    level = np.log(np.array([3.0, 2.0, 4.0, 1.5, 2.5, 3.5, 2.0, 1.2]))
    attraction = np.exp(level + spread * rng.normal(size=(n_draws, 3, 8)))
    category = np.clip(0.6 + 0.3 * spread * rng.normal(size=n_draws), 0.2, 1.0)
    power = np.clip(np.array([0.4, 0.6, 0.8]) + 0.3 * spread * rng.normal(size=(n_draws, 3)), 0.1, 1.0)
    return StoreDemand(
        attraction=attraction,
        dissimilarity=category[:, None] * power,
        category_dissimilarity=category,
        scale=np.tile(np.array([40.0, 36.0, 25.0, 24.0, 12.0, 10.0]), (n_draws, 1)),
        segment=np.array([0, 0, 0, 0, 1, 1, 1, 2]),
        cluster=np.array([0, 0, 1, 1, 2, 2]),
        shoppers=None,
        price_effect=np.full((n_draws, 3), -1.5),
    )


def fitted() -> FittedModel:
    """A fit with 40 draws; the Rooibos segment has one item and no changes."""
    return FittedModel(
        model="nested",
        with_shoppers=False,
        log_likelihood=-1234.5,
        parameters=(
            Parameter("ln regular price", "price", -1.5, 0.2),
            Parameter("promotion", "promotion", 0.6, 0.05),
        ),
        segments=(
            SegmentFinding("Green", 4, 0.24, 0.05, 0.40, 0.33, 0.48, 7, 0.12),
            SegmentFinding("Herbal", 3, 0.36, 0.06, 0.60, 0.50, 0.70, 2, 0.10),
            SegmentFinding("Rooibos", 0, 0.48, 0.20, 0.80, 0.40, 0.95, 0, 0.0),
        ),
        category_dissimilarity=0.6,
        category_low=0.5,
        category_high=0.7,
        dispersion=1.3,
        estimate=demand(1, 0.0),
        draws=demand(40, 0.15),
        converged=True,
        iterations=9,
        evaluations=14,
        decrement=1e-7,
        seconds=0.4,
        seed=1,
        notes=("Fitted on 60 store-weeks.",),
    )


def base_week() -> BaseWeek:
    """Today: regular prices, costs, space."""
    price = np.array([3.0, 4.8, 2.4, 3.6, 3.3, 2.1, 3.0, 3.6]) * np.array([[1.0], [1.05], [1.1]])
    cost = np.array([item.cost for item in ITEMS], dtype=np.float64)
    net = price / 1.2
    limit = np.array([62.0, 66.0, 52.0, 50.0, 40.0, 40.0])
    return BaseWeek(
        today=TODAY.copy(),
        units=demand(1, 0.0).units(TODAY)[0],
        weeks=6,
        first_week=WEEKS[4],
        price=price,
        cost=cost,
        margin=net - cost,
        net_price=net,
        shoppers=None,
        space_cm=np.array([item.space_cm for item in ITEMS]),
        space_limit=limit,
        space_known=True,
        notes=("Space is missing for 1 store; today's use is its limit: S6.",),
    )


def panel() -> MarketPanel:
    """Ten weeks of six stores; item 0104 leaves store S4 and 0202 comes into S6 in week 5."""
    rng = np.random.default_rng(3)
    store, week = np.repeat(np.arange(6), 10), np.tile(np.arange(10), 6)
    listed = TODAY[store].copy()
    listed[(store == 3) & (week < 5), 3] = True
    listed[(store == 5) & (week < 5), 5] = False
    units = rng.poisson(6.0, listed.shape) * listed
    price = np.broadcast_to(base_week().price[np.array([0, 0, 1, 1, 2, 2])][store], listed.shape).copy()
    promotion = ((week == 7)[:, None] & (np.arange(8) == 0)[None, :] & listed).astype(np.float64)
    return MarketPanel(
        weeks=WEEKS,
        store_index=store,
        week_index=week,
        units=units.astype(np.float64),
        listed=listed,
        on_sale=listed.astype(np.float64),
        regular_price=price,
        price=price * (1.0 - 0.2 * promotion),
        promotion=promotion,
        display=np.zeros_like(price),
        shoppers=None,
    )


def report() -> LoadReport:
    """One kind of row set aside, one only noted."""
    return LoadReport(
        rows_read=470,
        rows_used=466,
        money_read=Decimal("10123.45"),
        money_used=Decimal("10100.40"),
        checks=(
            Check("duplicate_row", "Row that repeats an earlier row exactly", 4, Decimal("23.05"), True,
                  "set aside", (("sales.csv", 17, "store=S1, item=0101"), ("sales.csv", 18, ""))),
            Check("cost_above_price", "Item whose cost is above its price", 1, Decimal("0"), False,
                  "kept; check the cost", (("items.csv", 0, "0104"),)),
        ),
        matches=(("sales", "units", "qty"), ("sales", "revenue", "turnover")),
        events=(
            ListingEvent("S4", "0104", WEEKS[5], "delisted"),
            ListingEvent("S6", "0202", WEEKS[5], "listed"),
        ),
        notes=("No shoppers table: the category's volume stands in for shoppers.",),
    )  # fmt: skip


def loaded() -> LoadedData:
    """Everything that was loaded."""
    aside = pd.DataFrame(
        {
            "file": pd.Series(["sales.csv"] * 4, dtype="str"),
            "row": np.array([17, 18, 40, 41]),
            "reason": pd.Series(["Row that repeats an earlier row exactly"] * 4, dtype="str"),
            "item": pd.Series(["0101", "=1+1", "", None], dtype="str"),
        }
    )
    request = LoadRequest(Path("in/sales.csv"), Path("in/items.csv"), matches=(("sales", "units", "qty"),))
    return LoadedData(request, catalogue(), panel(), base_week(), report(), aside)


def without_costs(data: LoadedData) -> LoadedData:
    """The same review with no cost at all."""
    blank = np.full_like(data.base.cost, np.nan)
    return replace(data, base=replace(data.base, cost=blank, margin=np.full_like(data.base.margin, np.nan)))


def now() -> States:
    """States (3, 8) of today."""
    return today_states(TODAY, demand(1, 0.0).cluster, 3)


def planned() -> States:
    """Large: 0104 delisted, the offer listed.  Middle: 0104 withdrawn, 0202 extended.  Small: as today."""
    states = now().copy()
    states[0, 3], states[0, 7] = 0, 1
    states[1, 3], states[1, 5] = 0, 1
    return states


def limits() -> Limits:
    """Every kind of limit once."""
    return Limits(
        goal="margin",
        max_changes=6,
        clusters=(ClusterLimit("Large", space=64.0, min_items=5, max_items=7),),
        locks=(
            ItemLock("0203", "keep", "", "listed for shoppers who need it", "2026-12-31"),
            ItemLock("0301", "never", "Small", "no room"),
            ItemLock("0101", "as today"),
        ),
        listing_cost=2.5,
        delisting_cost=1.25,
    )


def plan() -> NamedPlan:
    """A recommended plan with a ladder of three rungs."""
    two = now().copy()
    two[0, 3], two[0, 7] = 0, 1
    value, bound = 417.6, 418.0
    return NamedPlan(
        name="Spring, tight",
        states=planned(),
        created="2026-03-20T10:30:00",
        limits=limits(),
        outcome=SolverOutcome("within target", value, bound, (bound - value) / value, 1.5, 401.2),
        rungs=(
            PlanRung(0, 401.2, 401.2, now()),
            PlanRung(2, 411.0, 412.0, two),
            PlanRung(4, value, bound, planned()),
        ),
        reasons=(("0104", "", "slow, and twin of 0101"), ("0301", "Large", "new flavour")),
        notes="Agreed with the buyer.",
    )
