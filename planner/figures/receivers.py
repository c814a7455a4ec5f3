"""Who gains and who loses, as bars with interval whiskers."""

from __future__ import annotations

from matplotlib.figure import Figure

from planner.base.text import _
from planner.figures.style import BLUE, FAINT, INK, VERMILLION, new_figure, plain, shortened, tidy
from planner.tables.table import Table


def largest_rows(table: Table, kinds: tuple[str, ...], most: int) -> list[int]:
    """Rows of these kinds with the largest changes either way, largest gain first.

    table: the receivers table.  Rows without any change are left out.
    """
    change = [float(str(value)) for value in table.column("change").values]
    kind = table.column("kind").values
    rows = [row for row in range(table.n_rows) if kind[row] in kinds and abs(change[row]) > 1e-9]
    rows = sorted(rows, key=lambda row: -abs(change[row]))[:most]
    return sorted(rows, key=lambda row: (-change[row], row))


def receivers_figure(table: Table, most: int = 14) -> Figure:
    """Changes of single items and of what leaves the category, the largest gain on top.

    table: as receivers_table makes it.  A changed item is hatched and named as such.
    """
    rows = largest_rows(table, ("changed", "item", "leaves"), most)
    change, low, high = (
        [float(str(table.column(key).values[row])) for row in rows] for key in ("change", "low", "high")
    )
    kind = [str(table.column("kind").values[row]) for row in rows]
    names = [shortened(str(table.column("description").values[row]), 34) for row in rows]
    labels = [
        _("{name} (changed)").format(name=name) if what == "changed" else name
        for name, what in zip(names, kind, strict=True)
    ]
    figure = new_figure(7.2, max(2.2, 0.9 + 0.26 * len(rows)))
    axes = figure.add_subplot()
    places = list(range(len(rows)))
    bars = axes.barh(
        places, change, height=0.62, color=[BLUE if value >= 0.0 else VERMILLION for value in change]
    )
    for bar, what in zip(bars, kind, strict=True):
        if what == "changed":
            bar.set_hatch("///")
            bar.set_edgecolor("white")
    axes.hlines(places, low, high, color=INK, linewidth=1.2)
    axes.plot([*low, *high], [*places, *places], linestyle="none", marker="|", color=INK, markersize=6)
    axes.axvline(0.0, color=INK, linewidth=0.8)
    axes.set_yticks(places, [plain(label) for label in labels])
    axes.invert_yaxis()
    axes.grid(axis="x", color=FAINT, linewidth=0.6)
    unit = table.column("change").unit
    axes.set_xlabel(
        plain(_("Change, {unit}; lines: 80 % intervals").format(unit=unit)), fontsize=8, color=INK
    )
    tidy(axes, _("Who gains and who loses"))
    return figure
