"""The ladder of changes: what each further change is worth, and what no plan can exceed."""

from __future__ import annotations

from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from planner.base.text import _
from planner.figures.style import BLUE, FAINT, INK, VERMILLION, new_figure, plain, tidy
from planner.tables.table import Table


def ladder_figure(table: Table, unit: str) -> Figure:
    """Gain of the best plan found for at most so many changes, with its proven bound.

    table: as ladder_table makes it; unit: what the value counts, in words.
    """
    changes = [int(str(value)) for value in table.column("changes").values]
    value = [float(str(v)) for v in table.column("value").values]
    gain = [float(str(v)) for v in table.column("gain").values]
    bound = [float(str(v)) for v in table.column("bound").values]
    start = value[0] - gain[0] if value else 0.0
    most = [b - start for b in bound]
    figure = new_figure(7.2, 3.0)
    axes = figure.add_subplot()
    axes.plot(changes, most, color=VERMILLION, marker="v", markersize=5, linewidth=1.2, linestyle="--",
              label=_("proven bound"))  # fmt: skip
    axes.plot(changes, gain, color=BLUE, marker="o", markersize=5, linewidth=1.6, label=_("best plan found"))
    axes.axhline(0.0, color=INK, linewidth=0.8)
    axes.grid(axis="y", color=FAINT, linewidth=0.6)
    axes.xaxis.set_major_locator(MaxNLocator(integer=True))
    axes.set_xlabel(_("Changes against today, at most"), fontsize=8, color=INK)
    axes.set_ylabel(plain(unit), fontsize=8, color=INK)
    axes.legend(frameon=False, fontsize=8, labelcolor=INK, loc="lower right")
    tidy(axes, _("Gain of the best plan for so many changes (estimate)"))
    return figure
