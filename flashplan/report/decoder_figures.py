"""Figures of the decoder comparison: cost against error, and fault maps."""

import numpy as np
from matplotlib.figure import Figure

from flashplan.decoder import DecoderTable, FaultMaps
from flashplan.report.drawing import COLOURS, GOOD, INK, QUIET, new_figure


def ranking_figure(table: DecoderTable) -> Figure:
    """A row per scheme, fewest gates first: its gates on the left, its rms errors on the right.

    The right half has the error over all conversions and the one given an undecided comparator; green: good enough.
    """
    schemes = sorted(table.schemes, key=lambda scheme: scheme.gates, reverse=True)
    place = np.arange(len(schemes))
    figure, (left,) = new_figure(height=1.1 + 0.27 * len(schemes))
    figure.clear()
    left, right = figure.subplots(1, 2, sharey=True)
    colours = [GOOD if scheme.good_enough else QUIET for scheme in schemes]
    left.barh(place, [scheme.gates for scheme in schemes], color=colours, height=0.6)
    for row, scheme in enumerate(schemes):
        left.annotate(
            f"{scheme.gates}, {scheme.depth} deep",
            (scheme.gates, row),
            xytext=(3, 0),
            textcoords="offset points",
            va="center",
            fontsize=7.5,
        )
    left.set_xlim(0, 1.45 * max(scheme.gates for scheme in schemes))
    left.set_yticks(place, [scheme.name for scheme in schemes])
    left.set_xlabel("gates (green: good enough here)")
    kinds = (
        ("all conversions", "rms_error_lsb", COLOURS[0], "o"),
        ("given an undecided one", "undecided_rms_error_lsb", COLOURS[1], "D"),
    )
    values = [getattr(scheme, key) for _, key, _, _ in kinds for scheme in schemes]
    smallest = min([value for value in values if value > 0], default=1.0)
    # Linear below the smallest error, so that none at all has a place too.
    right.set_xscale("symlog", linthresh=smallest, linscale=0.5)
    decades = 10.0 ** np.arange(np.ceil(np.log10(smallest)), 5)
    marks = [0.0, *decades[decades < 3 * max([*values, smallest])]]
    right.set_xticks(marks, [f"{mark:g}" for mark in marks])
    right.minorticks_off()
    for label, key, colour, marker in kinds:
        errors = [getattr(scheme, key) for scheme in schemes]
        right.plot(errors, place, marker, color=colour, label=label, clip_on=False)
    right.set_xlim(0, 3 * max([*values, smallest]))
    right.set_xlabel("rms error in LSB")
    right.legend(
        frameon=False,
        loc="lower center",
        bbox_to_anchor=(0.5, 1.0),
        ncols=2,
        fontsize=7.5,
    )
    for axes in (left, right):
        axes.tick_params(labelsize=8)
        axes.spines[["top", "right"]].set_visible(False)
        axes.set_ylim(-0.6, len(schemes) - 0.4)
    return figure


def fault_map_figure(maps: FaultMaps) -> Figure:
    """A panel per scheme: largest error by bubble order (down) and distance from the edge (across)."""
    names = list(maps.errors)
    rows = -(-len(names) // 3)
    figure, _ = new_figure(height=0.7 + 1.25 * rows)
    figure.clear()
    panels = figure.subplots(rows, 3, sharex=True, sharey=True, squeeze=False)
    top = max(float(np.nanmax(errors)) for errors in maps.errors.values())
    levels = {
        name: np.log2(1 + np.nan_to_num(errors)) for name, errors in maps.errors.items()
    }
    ticks = range(maps.distances.size)
    for axes, name in zip(panels.flat, names, strict=False):
        image = axes.imshow(
            levels[name], cmap="cividis", vmin=0, vmax=np.log2(1 + top), aspect="auto"
        )
        for (row, column), error in np.ndenumerate(maps.errors[name]):
            if not np.isnan(error):
                dark = levels[name][row, column] < 0.55 * np.log2(1 + top)
                axes.text(
                    column,
                    row,
                    f"{error:.0f}",
                    ha="center",
                    va="center",
                    fontsize=5.5,
                    color="white" if dark else INK,
                )
        axes.set_title(name, fontsize=8.5, loc="left")
        axes.grid(visible=False)
        axes.set_yticks(
            range(len(maps.orders)), [str(order) for order in maps.orders], fontsize=7
        )
        axes.set_xticks(ticks, [str(d) for d in maps.distances], fontsize=6)
    for axes in list(panels.flat)[len(names) :]:
        axes.set_visible(False)
    scale = figure.colorbar(image, ax=panels, shrink=0.6)
    marks = [m for m in (0, 1, 3, 7, 15, 31, 63, 127, 255, 1023, 4095) if m <= top]
    scale.set_ticks(
        [np.log2(1 + mark) for mark in marks], labels=[str(mark) for mark in marks]
    )
    scale.set_label("largest error in LSB")
    figure.supxlabel("distance of the bubble from the edge, in decisions", fontsize=9)
    figure.supylabel("order of the bubble", fontsize=9)
    return figure
