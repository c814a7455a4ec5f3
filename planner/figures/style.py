"""The look of figures for workbook and report: two colours, plain axes, no shared state."""

from __future__ import annotations

import io

from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

# Okabe & Ito (2008); for marks only, text is never written in them.
BLUE, VERMILLION = "#0072B2", "#D55E00"
INK, FAINT = "#1b1d1f", "#c3c3bf"


def new_figure(width: float, height: float) -> Figure:
    """An empty figure of this size in inches, drawn without a screen."""
    figure = Figure(figsize=(width, height), facecolor="white", layout="constrained")
    FigureCanvasAgg(figure)
    return figure


def plain(text: str) -> str:
    """Text that is never read as mathematics, whatever signs it holds."""
    return text.replace("$", r"\$")


def shortened(text: str, most: int) -> str:
    """At most so many signs."""
    return text if len(text) <= most else text[: most - 1].rstrip() + "…"


def tidy(axes: Axes, title: str) -> None:
    """Title on the left, no box, faint grid along the value axis."""
    axes.set_title(plain(title), loc="left", fontsize=10, color=INK)
    for side in ("top", "right", "left"):
        axes.spines[side].set_visible(False)
    axes.spines["bottom"].set_color(FAINT)
    axes.tick_params(colors=INK, labelsize=8, length=0)
    axes.set_axisbelow(True)


def png_of(figure: Figure, dots_per_inch: int = 150) -> bytes:
    """The figure as PNG bytes, the same for the same figure."""
    sink = io.BytesIO()
    figure.savefig(sink, format="png", dpi=dots_per_inch, metadata={"Software": None})
    return sink.getvalue()
