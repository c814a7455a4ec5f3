"""The ladder of changes: what each further change is worth, and what no plan can exceed."""

from __future__ import annotations

from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from planner.base.text import _
from planner.figures.style import BLUE, FAINT, INK, VERMILLION, new_figure, plain, tidy
from planner.tables.table import Table

# Bounds so many times above the largest gain are not drawn.
_FAR = 3.0


def ladder_figure(table: Table, unit: str) -> Figure:
    """Gain of the best plan found for at most so many changes, with its proven bound.

    table: as ladder_table makes it; unit: what the value counts, in words.
    """
    changes = [int(str(value)) for value in table.column("changes").values]
    value, gain, bound = (
        [float(str(v)) for v in table.column(key).values] for key in ("value", "gain", "bound")
    )
    start = value[0] - gain[0] if value else 0.0
    most = [b - start for b in bound]
    figure = new_figure(7.2, 3.0)
    axes = figure.add_subplot()
    title = _("Gain of the best plan for so many changes (estimate)")
    # A bound far away would press the gains flat; then it is named instead of drawn.
    if most and min(most) <= _FAR * max(*gain, 1e-9):
        axes.plot(changes, most, color=VERMILLION, marker="v", markersize=5, linewidth=1.2, linestyle="--",
                  label=_("proven bound"))  # fmt: skip
    else:
        title = _("{title}; proven bound above the picture").format(title=title)
    axes.plot(changes, gain, color=BLUE, marker="o", markersize=5, linewidth=1.6, label=_("best plan found"))
    axes.axhline(0.0, color=INK, linewidth=0.8)
    axes.grid(axis="y", color=FAINT, linewidth=0.6)
    axes.xaxis.set_major_locator(MaxNLocator(integer=True))
    axes.set_xlabel(_("Changes against today, at most"), fontsize=8, color=INK)
    axes.set_ylabel(plain(unit), fontsize=8, color=INK)
    axes.legend(frameon=False, fontsize=8, labelcolor=INK, loc="upper left")
    tidy(axes, title)
    return figure
