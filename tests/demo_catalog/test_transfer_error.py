"""The fitted transfers against the generator's truth, and the proportional rule beside them.

Three markets of individual shoppers: the committed one and two further seeds.  Ten delistings,
evenly spaced by what the items sell; error = half the sum of absolute differences of transfer
shares, no purchase included, weighted by the delisted items' volume.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from demo_catalog.generate import DemoSettings, TrueMarket, build, write
from planner.base.paths import demo_folder
from planner.demand.nested import fit_nested
from planner.demand.settings import NestedSettings
from planner.sales.load import load, request_from_folder
from planner.sales.report import LoadedData
from planner.transfer.delistings import delistings
from planner.transfer.rules import proportional, transfer_error

DELISTINGS = 10


def true_transfers(market: TrueMarket, loaded: LoadedData) -> tuple[np.ndarray, np.ndarray]:
    """Shares (J, J + 1) by exact recomputation for the same shoppers, and units (J,), catalogue order."""
    place = {code: k for k, code in enumerate(market.items)}
    order = np.array([place[item.code] for item in loaded.catalogue.items])
    before = market.units(market.today)
    n_items = order.size
    shares, volume = np.zeros((n_items, n_items + 1)), np.zeros(n_items)
    for j, own in enumerate(order):
        if not market.today[:, own].any():
            continue
        without = market.today.copy()
        without[:, own] = False
        change = (market.units(without) - before).sum(axis=0)[order]
        volume[j] = -change[j]
        if volume[j] > 0.0:
            shares[j, :n_items] = change / volume[j]
            shares[j, j] = 0.0
            shares[j, n_items] = 1.0 - shares[j].sum()
    return shares, volume


def ten_items(volume: np.ndarray) -> np.ndarray:
    """Ten items evenly spaced by volume, from the best seller down."""
    sold = np.flatnonzero(volume > 0.0)
    ranked = sold[np.argsort(-volume[sold], kind="stable")]
    return ranked[np.linspace(0, ranked.size - 1, DELISTINGS).round().astype(int)]


@pytest.fixture(scope="module", params=["committed", 8, 9])
def case(request, tmp_path_factory):
    """Loaded data and the true market behind it."""
    if request.param == "committed":
        return "committed", load(request_from_folder(demo_folder())), build(DemoSettings()).market
    folder = tmp_path_factory.mktemp(f"seed{request.param}")
    demo = build(DemoSettings(seed=request.param))
    write(demo, Path(folder))
    return f"seed {request.param}", load(request_from_folder(Path(folder))), demo.market


def estimated(loaded: LoadedData, with_shoppers: bool) -> np.ndarray:
    """Transfer shares (J, J + 1) of the nested model."""
    settings = NestedSettings(use_shoppers=None if with_shoppers else False)
    fit = fit_nested(loaded.panel, loaded.catalogue, loaded.base, settings)
    assert fit.converged
    assert fit.with_shoppers == with_shoppers
    found = delistings(fit, loaded.base)
    units = np.where(found.units > 0.0, found.units, 1.0)
    shares = np.nan_to_num(found.moved / units[:, None])
    np.fill_diagonal(shares, 0.0)
    return shares


@pytest.mark.parametrize("with_shoppers", [False, True])
def test_nested_transfers_err_at_most_half_as_much_as_the_proportional_rule(case, with_shoppers, capsys):
    name, loaded, market = case
    true, volume = true_transfers(market, loaded)
    units = loaded.base.units.sum(axis=0)
    rule = np.stack([proportional(units, None, np.arange(units.size) == j) for j in range(units.size)])
    shares = estimated(loaded, with_shoppers)
    picked, every = ten_items(volume), np.flatnonzero(volume > 0.0)
    rows = []
    for title, items in (("10 delistings", picked), (f"all {every.size}", every)):
        nested = transfer_error(shares[items], true[items], volume[items])
        simple = transfer_error(rule[items], true[items], volume[items])
        leaves = [float((s[items, -1] * volume[items]).sum() / volume[items].sum()) for s in (shares, true)]
        rows.append((title, nested, simple, nested / simple, *leaves))
    with capsys.disabled():
        form = "with shoppers" if with_shoppers else "without shoppers"
        for title, nested, simple, part, leaves, true_leaves in rows:
            print(
                f"\n{name}, {form}, {title}: error nested {nested:.3f}, proportional {simple:.3f}, "
                f"part {part:.2f}; leaves {leaves:.3f} (true {true_leaves:.3f})",
                end="",
            )
    for _title, nested, simple, *_rest in rows:
        assert nested <= 0.5 * simple
