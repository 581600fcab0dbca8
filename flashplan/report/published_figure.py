"""The plan among published converters: energy per conversion, rate and effective bits."""

import matplotlib as mpl
import numpy as np
from matplotlib.figure import Figure

from flashplan.report.drawing import COLOURS, INK, new_figure
from flashplan.report.published import published_converters


def published_figure(rate: float, power: float | None, enob: float | None) -> Figure:
    """Scatter of published flash and subranging converters with the plan as a star.

    rate in Hz; power in W, of what is known of the plan; None draws the published ones and the plan's rate alone.
    """
    figure, (axes,) = new_figure(height=3.8)
    rows = published_converters()
    bits = np.array([row.enob for row in rows])
    colours = mpl.colormaps["cividis"]
    norm = mpl.colors.Normalize(3, 10)
    flash = np.array(["lash" in row.architecture for row in rows])
    for chosen, marker, name in (
        (flash, "o", "published flash"),
        (~flash, "s", "published folding, two-step, subranging"),
    ):
        points = axes.scatter(
            [row.rate for row, c in zip(rows, chosen, strict=True) if c],
            [row.energy for row, c in zip(rows, chosen, strict=True) if c],
            c=bits[chosen],
            cmap=colours,
            norm=norm,
            marker=marker,
            s=26,
            linewidths=0.4,
            edgecolors=INK,
            label=name,
        )
    if power is None or enob is None:
        axes.axvline(
            rate, color=COLOURS[1], label="this plan's rate (its energy is not known)"
        )
    else:
        axes.scatter(
            [rate],
            [power / rate],
            marker="*",
            s=190,
            color=COLOURS[1],
            edgecolors=INK,
            zorder=5,
            label="this plan",
        )
        axes.annotate(
            f"{enob:.2f} bits",
            (rate, power / rate),
            xytext=(9, 6),
            textcoords="offset points",
            color=COLOURS[1],
            weight="bold",
        )
    axes.set_xscale("log")
    axes.set_yscale("log")
    axes.set_xlabel("conversions per second [1/s]")
    axes.set_ylabel("energy per conversion [J]")
    axes.legend(
        frameon=False, loc="lower left", bbox_to_anchor=(0, 1), ncols=2, fontsize=8
    )
    figure.colorbar(points, ax=axes, label="effective bits")
    return figure
