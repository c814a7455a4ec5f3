"""Figures: what is drawn, in which order, and the same bytes each time."""

from __future__ import annotations

import sys

import matplotlib
import numpy as np
from matplotlib.colors import to_hex
from matplotlib.figure import Figure

from planner.figures.ladder import ladder_figure
from planner.figures.receivers import largest_rows, receivers_figure
from planner.figures.style import BLUE, VERMILLION, plain, png_of, shortened
from planner.tables.ladder import ladder_table
from planner.tables.names import changed_pairs
from planner.tables.plan import cluster_of
from planner.tables.receivers import receivers_table
from planner.tables.table import Table
from planner.transfer.tally import tally
from tests.tables import records


def receivers() -> Table:
    data = records.loaded()
    effects = tally(records.fitted(), data.base, records.planned()).effects
    changed = changed_pairs(data.base.today, cluster_of(data), records.planned())
    return receivers_table(data, effects, changed=changed)


def drawn_text(figure: Figure) -> list[str]:
    return [label.get_text() for label in figure.axes[0].get_yticklabels()]


def test_the_largest_gain_stands_on_top() -> None:
    figure = receivers_figure(receivers())
    axes = figure.axes[0]
    widths = [bar.get_width() for bar in axes.patches]
    assert widths == sorted(widths, reverse=True)
    assert axes.yaxis_inverted()
    assert drawn_text(figure)[0] == "Rooibos new (changed)"
    assert drawn_text(figure)[-1].startswith("Leaves the category")
    colours = {to_hex(bar.get_facecolor()).upper() for bar in axes.patches}
    assert colours == {BLUE, VERMILLION}


def test_only_the_largest_changes_either_way() -> None:
    table = receivers()
    rows = largest_rows(table, ("changed", "item", "leaves"), 3)
    change = np.array([float(str(v)) for v in table.column("change").values])
    every = [k for k, kind in enumerate(table.column("kind").values) if kind in ("changed", "item", "leaves")]
    expected = sorted(every, key=lambda k: -abs(change[k]))[:3]
    assert set(rows) == set(expected)
    assert list(change[rows]) == sorted(change[rows], reverse=True)


def test_whiskers_are_the_intervals() -> None:
    table = receivers()
    lines = receivers_figure(table).axes[0].collections[0].get_segments()
    rows = largest_rows(table, ("changed", "item", "leaves"), 14)
    ends = [(line[0][0], line[1][0]) for line in lines]
    assert ends == [(table.column("low").values[k], table.column("high").values[k]) for k in rows]


def test_names_with_dollar_signs_are_not_mathematics() -> None:
    table = receivers()
    names = [f"$x_{k}$ ${name}" for k, name in enumerate(table.column("description").values)]
    column = table.column("description")
    changed = Table(
        table.key,
        table.title,
        tuple(
            type(c)(c.key, c.title, c.kind, names, c.unit, c.decimals) if c is column else c
            for c in table.columns
        ),
    )
    figure = receivers_figure(changed)
    png_of(figure)
    assert drawn_text(figure)[0].startswith(r"\$x_")
    assert plain("5 $") == r"5 \$"
    assert shortened("abcdef", 4) == "abc…"


def test_ladder_draws_found_and_bound() -> None:
    table = ladder_table(records.loaded(), records.plan().rungs)
    axes = ladder_figure(table, "margin").axes[0]
    curves = {line.get_label(): np.asarray(line.get_ydata(), dtype=float) for line in axes.lines}
    np.testing.assert_allclose(curves["best plan found"], [0.0, 9.8, 16.4], atol=1e-9)
    np.testing.assert_allclose(curves["proven bound"], [0.0, 10.8, 16.8], atol=1e-9)


def test_a_far_bound_is_named_not_drawn() -> None:
    rungs = [type(r)(r.changes, r.value, r.bound + 500.0, r.states) for r in records.plan().rungs]
    axes = ladder_figure(ladder_table(records.loaded(), rungs), "margin").axes[0]
    assert "proven bound" not in [line.get_label() for line in axes.lines]
    assert "proven bound above the picture" in axes.get_title(loc="left")


def test_png_bytes_are_the_same_each_time() -> None:
    first, second = (png_of(receivers_figure(receivers())) for _round in range(2))
    assert first == second
    assert first.startswith(b"\x89PNG")
    assert b"Software" not in first


def test_no_shared_plotting_state() -> None:
    png_of(receivers_figure(receivers()))
    assert "matplotlib.pyplot" not in sys.modules or not matplotlib.pyplot.get_fignums()
