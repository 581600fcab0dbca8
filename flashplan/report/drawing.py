"""How every figure looks: size, colours, fonts, and its SVG text."""

import io
from typing import Any

import matplotlib as mpl
from matplotlib.axes import Axes
from matplotlib.figure import Figure

# Colour-blind-safe hues of M. Okabe and K. Ito, "Color universal design", 2008, in an order of our own.
INK = "#2b2f36"
COLOURS = ("#0072b2", "#d55e00", "#009e73", "#cc79a7", "#e69f00", "#56b4e9")
GOOD, BAD, QUIET = "#009e73", "#d55e00", "#9aa3ad"

_STYLE: Any = {
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],
    "font.size": 9,
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "text.color": INK,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.grid": True,
    "grid.color": "#e4e7eb",
    "grid.linewidth": 0.7,
    "axes.axisbelow": True,
    "svg.fonttype": "path",
    "svg.hashsalt": "flashplan",
}


def new_figure(rows: int = 1, height: float = 3.4) -> tuple[Figure, list[Axes]]:
    """An empty figure in the house style, 6.8 inch wide, with `rows` axes one above the other."""
    with mpl.rc_context(_STYLE):
        figure = Figure(figsize=(6.8, height), layout="constrained")
        axes = [figure.add_subplot(rows, 1, index + 1) for index in range(rows)]
    return figure, axes


def as_svg(figure: Figure) -> str:
    """The figure as SVG text, the same text for the same figure."""
    buffer = io.StringIO()
    with mpl.rc_context(_STYLE):
        figure.savefig(
            buffer, format="svg", metadata={"Date": None, "Creator": "flashplan"}
        )
    return buffer.getvalue()
