"""Figures of the reference ladder."""

import math

import numpy as np
from matplotlib.colors import TwoSlopeNorm
from matplotlib.figure import Figure

from flashplan.ladder import LadderResult, effects
from flashplan.ladder.tradeoff import TradeOff
from flashplan.ladder.transients import Disturbance, StepMap
from flashplan.quantity import show
from flashplan.report.drawing import COLOURS, INK, QUIET, new_figure

# What stays is drawn solid, what the input moves dashed, what scatters dotted.
_DRAWN = {
    "lead": ("leads", COLOURS[0], "-"),
    "bias": ("bias current", COLOURS[1], "-"),
    "gradient": ("gradient", COLOURS[4], "-"),
    "turns": ("turns", QUIET, "-"),
    "kickback": ("kickback at rest", COLOURS[2], "-"),
    "feedthrough": ("feedthrough (amplitude)", COLOURS[3], "--"),
    "mismatch": ("mismatch (one sigma)", COLOURS[5], ":"),
    "noise": ("thermal noise (rms)", INK, ":"),
}
_NOTHING = 1e-6  # LSB


def tap_error_figure(result: LadderResult) -> Figure:
    """Error of each tap, one line an effect; effects that are nowhere above a millionth of an LSB are only named."""
    figure, (axes,) = new_figure(height=3.8)
    absent = []
    for name, errors in effects(result).items():
        label, colour, style = _DRAWN[name]
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
    axes.set_xlabel("tap" + (f"\n({', '.join(absent)})" if absent else ""))
    axes.set_ylabel("error [LSB]")
    axes.set_xlim(1, result.taps.size)
    axes.legend(
        frameon=False, loc="lower left", bbox_to_anchor=(0, 1), ncols=3, fontsize=8
    )
    return figure


def disturbance_figure(disturbance: Disturbance) -> Figure:
    """Movement of the worst tap over some clock periods, and where the decisions find it."""
    figure, (axes,) = new_figure()
    periods = round(disturbance.time[-1] / disturbance.period + 0.5)
    axes.plot(
        disturbance.time / disturbance.period,
        disturbance.movement_lsb,
        color=COLOURS[2],
        linewidth=1.4,
        label=f"tap {disturbance.tap}",
    )
    axes.plot(
        np.arange(1, periods + 1),
        np.full(periods, disturbance.decision_lsb),
        "o",
        color=COLOURS[1],
        clip_on=False,
        zorder=3,
        label=f"at the decision: {disturbance.decision_lsb:.3g} LSB",
    )
    axes.set_xlim(0, periods)
    axes.set_xlabel(
        f"time after a clock edge [periods of {show(disturbance.period, 's', 3)}]"
    )
    axes.set_ylabel("movement [LSB]")
    axes.legend(
        frameon=False, loc="lower left", bbox_to_anchor=(0, 1), ncols=2, fontsize=8
    )
    return figure


def step_map_figure(step: StepMap) -> Figure:
    """All taps against time after a full-scale step of the input."""
    figure, (axes,) = new_figure(height=3.6)
    count = step.movement_lsb.shape[1]
    reach = max(float(np.abs(step.movement_lsb).max()), _NOTHING)
    periods = step.time[-1] / step.period
    image = axes.imshow(
        step.movement_lsb.T,
        origin="lower",
        aspect="auto",
        extent=(0, round(periods + 0.01), 0.5, count + 0.5),
        cmap="PuOr_r",
        norm=TwoSlopeNorm(0.0, -reach, reach),
        interpolation="nearest",
    )
    axes.grid(visible=False)
    axes.set_xlabel(
        f"time after the input's step [periods of {show(step.period, 's', 3)}]"
    )
    axes.set_ylabel("tap")
    figure.colorbar(image, ax=axes, label="movement [LSB]")
    return figure


def tradeoff_figure(
    trade: TradeOff,
    systematic_lsb: float,
    power_lsb2: float,
    chosen: float | None = None,
) -> Figure:
    """What each effect takes of its room against the total resistance; the reference power on the upper edge.

    systematic_lsb, power_lsb2: the rooms, as in `largest_resistance`; chosen: a resistance to mark, in ohm.
    """
    figure, (axes,) = new_figure(height=3.9)
    lines = (
        ("fixed errors", trade.systematic_lsb / systematic_lsb, COLOURS[0], "-"),
        ("kickback", trade.kickback_lsb2 / power_lsb2, COLOURS[2], "-"),
        ("feedthrough", trade.feedthrough_lsb2 / power_lsb2, COLOURS[3], "--"),
        ("thermal noise", trade.noise_lsb2 / power_lsb2, INK, ":"),
    )
    for label, used, colour, style in lines:
        if used.max() > 0:
            axes.loglog(trade.total_resistance, used, style, color=colour, label=label)
    axes.axhline(1.0, color=COLOURS[1], linewidth=1.0, label="room")
    if chosen is not None:
        axes.axvline(
            chosen, color=QUIET, linewidth=1.0, label=f"{show(chosen, 'ohm', 3)}"
        )
    axes.set_ylim(1e-4, 1e2)
    axes.set_xlim(trade.total_resistance[0], trade.total_resistance[-1])
    axes.set_xlabel("total resistance [ohm]")
    axes.set_ylabel("part of the room used")
    # Power falls steadily with the resistance, so that round powers can be marked along the upper edge.
    powers = _round_values(float(trade.power.min()), float(trade.power.max()))
    above = axes.secondary_xaxis("top")
    above.set_xticks(
        np.interp(powers, trade.power[::-1], trade.total_resistance[::-1]),
        [show(power, "W", 1) for power in powers],
    )
    above.set_xticks([], minor=True)
    above.set_xlabel("reference power")
    axes.legend(frameon=False, loc="center left", bbox_to_anchor=(1, 0.5), fontsize=8)
    return figure


def _round_values(low: float, high: float) -> list[float]:
    """1, 2 and 5 times the powers of ten from low to high, both > 0; only the powers of ten where those are many."""
    decades = range(math.floor(math.log10(low)), math.ceil(math.log10(high)) + 1)
    digits = (1, 2, 5) if high < 300 * low else (1,)
    values = [digit * 10.0**decade for decade in decades for digit in digits]
    return [value for value in values if low <= value <= high]
