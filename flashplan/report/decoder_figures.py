"""Figures of the decoder comparison."""

import numpy as np
from matplotlib.figure import Figure

from flashplan.decoder import DecoderTable
from flashplan.report.drawing import COLOURS, new_figure


def ranking_figure(table: DecoderTable) -> Figure:
    """Transistors of each scheme beside what a bubble and an undecided comparator cost it."""
    schemes = sorted(table.schemes, key=lambda scheme: -scheme.transistors)
    place = np.arange(len(schemes))
    figure, (axes,) = new_figure(height=0.9 + 0.36 * len(schemes))
    axes.barh(
        place, [scheme.transistors for scheme in schemes], height=0.6, color=COLOURS[5]
    )
    for y, scheme in zip(place, schemes, strict=True):
        axes.annotate(
            f"bubbles: rms {scheme.rms_error_lsb:.2g}, max {scheme.max_error_lsb} LSB;"
            f" undecided: max {scheme.undecided_max_error_lsb} LSB",
            (0, y),
            xytext=(5, 0),
            textcoords="offset points",
            va="center",
            fontsize=8,
        )
    axes.set_yticks(place, [scheme.name for scheme in schemes])
    axes.grid(axis="y", visible=False)
    axes.set_xlabel("transistors (estimate)")
    return figure
