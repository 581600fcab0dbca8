"""Figures of the reference ladder."""

import numpy as np
from matplotlib.figure import Figure

from flashplan.ladder import LadderResult, effects
from flashplan.report.drawing import COLOURS, new_figure

# What stays is drawn solid, what the input moves dashed, what scatters dotted.
_DRAWN = {
    "lead": ("lead", "-"),
    "bias": ("bias current", "-"),
    "kickback": ("kickback at rest", "-"),
    "feedthrough": ("feedthrough (amplitude)", "--"),
    "mismatch": ("mismatch (one sigma)", ":"),
    "noise": ("thermal noise (rms)", ":"),
}
_NOTHING = 1e-6  # LSB


def tap_error_figure(result: LadderResult) -> Figure:
    """Error of each tap, one line an effect; effects that are nowhere above a millionth of an LSB are only named."""
    figure, (axes,) = new_figure(height=3.8)
    absent = []
    for colour, (name, errors) in zip(COLOURS, effects(result).items(), strict=True):
        label, style = _DRAWN[name]
        if errors is None:
            absent.append(f"{label} not known")
        elif np.abs(errors).max() < _NOTHING:
            absent.append(f"{label} nil")
        else:
            axes.plot(
                np.arange(1, errors.size + 1),
                errors,
                style,
                color=colour,
                label=label,
                linewidth=1.4,
            )
    axes.set_xlabel("tap" + (f"   ({', '.join(absent)})" if absent else ""))
    axes.set_ylabel("error [LSB]")
    axes.set_xlim(1, result.taps.size)
    axes.legend(
        frameon=False, loc="lower left", bbox_to_anchor=(0, 1), ncols=3, fontsize=8
    )
    return figure
