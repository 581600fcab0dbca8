"""Figures of the budget's margins and of the simulated array."""

import numpy as np
from matplotlib.figure import Figure

from flashplan.array.result import BANDS, DynamicResult, StaticResult
from flashplan.cell.check import Verdict
from flashplan.plan.model import Plan
from flashplan.quantity import show
from flashplan.report.drawing import BAD, COLOURS, GOOD, INK, QUIET, new_figure

# A value this far below or above its limit is drawn at the edge; its number says the rest.
_FARTHEST = 10.0


def margin_figure(verdict: Verdict) -> Figure:
    """Each value as a part of its limit, on a logarithmic axis: what limits, and by how much."""
    lines = [
        line for line in verdict.lines.values() if line.value is not None and line.limit
    ]
    lines.sort(key=lambda line: line.margin or 0.0, reverse=True)
    figure, (axes,) = new_figure(height=0.9 + 0.3 * len(lines))
    parts = [line.value / line.limit for line in lines]  # type: ignore[operator]
    for place, (line, used) in enumerate(zip(lines, parts, strict=True)):
        drawn = min(max(used, 1 / _FARTHEST), _FARTHEST)
        colour = GOOD if line.met else BAD
        axes.plot(
            [1.0, drawn],
            [place, place],
            color=colour,
            linewidth=7,
            solid_capstyle="butt",
        )
        axes.annotate(
            f"{show(line.value, line.unit, 3)} of {show(line.limit, line.unit, 3)}",
            (max(drawn, 1.0), place),
            xytext=(6, 0),
            textcoords="offset points",
            va="center",
            fontsize=8,
        )
    axes.axvline(1.0, color=INK, linewidth=1.2)
    axes.set_xscale("log")
    axes.set_xlim(1 / _FARTHEST, 6 * min(max([1.0, *parts]), _FARTHEST))
    axes.set_xticks(
        [0.1, 0.2, 0.5, 1, 2, 5, 10], ["0.1", "0.2", "0.5", "1", "2", "5", "10"]
    )
    axes.minorticks_off()
    axes.set_yticks(range(len(lines)), [line.name for line in lines])
    axes.set_ylim(-0.6, len(lines) - 0.4)
    axes.grid(axis="y", visible=False)
    axes.set_xlabel("value as a part of its limit (left of 1: kept)")
    return figure


def linearity_figure(plan: Plan, static: StaticResult) -> Figure:
    """DNL and INL at each code: median and the middle 98 % of drawn arrays, with the goals."""
    figure, (top, bottom) = new_figure(2, 4.6)
    low, _, high = BANDS
    parts = (
        (top, "DNL", static.dnl_band_lsb, plan.goals.dnl_lsb),
        (
            bottom,
            f"INL ({plan.goals.linearity_fit} line)",
            static.inl_band_lsb,
            plan.goals.inl_lsb,
        ),
    )
    for axes, name, band, goal in parts:
        code = np.arange(1, band.shape[1] + 1)
        axes.fill_between(
            code,
            band[0],
            band[2],
            color=COLOURS[0],
            alpha=0.3,
            linewidth=0,
            label=f"{low:g} % to {high:g} % of arrays",
        )
        axes.plot(code, band[1], color=COLOURS[0], linewidth=1, label="median")
        for side in (-goal, goal):
            axes.axhline(
                side,
                color=BAD,
                linewidth=1,
                linestyle="--",
                label="goal" if side > 0 else None,
            )
        axes.set_ylabel(f"{name} [LSB]")
        axes.set_ylim(
            -1.15 * max(goal, np.abs(band).max()), 1.15 * max(goal, np.abs(band).max())
        )
        axes.set_xlim(1, code[-1])
    top.legend(frameon=False, loc="lower left", bbox_to_anchor=(0, 1), ncols=3)
    bottom.set_xlabel("code (DNL) and threshold (INL)")
    return figure


def worst_figure(plan: Plan, static: StaticResult) -> Figure:
    """Largest |DNL| and |INL| of each drawn array, with the goals."""
    figure, (axes,) = new_figure(height=3.0)
    for colour, name, values, goal in (
        (COLOURS[0], "DNL", static.max_dnl_lsb, plan.goals.dnl_lsb),
        (COLOURS[1], "INL", static.max_inl_lsb, plan.goals.inl_lsb),
    ):
        ordered = np.sort(values)
        axes.plot(
            ordered,
            np.arange(1, ordered.size + 1) / ordered.size,
            color=colour,
            label=f"largest |{name}|",
        )
        axes.axvline(goal, color=colour, linestyle="--", linewidth=1)
    axes.axhline(
        plan.goals.yield_,
        color=QUIET,
        linewidth=1,
        linestyle=":",
        label=f"yield goal {plan.goals.yield_:.4g}",
    )
    axes.set_xlabel("largest error of an array [LSB]; dashed: its goal")
    axes.set_ylabel("part of arrays below")
    axes.set_ylim(0, 1.02)
    axes.legend(frameon=False, loc="lower right")
    return figure


def spectrum_figure(plan: Plan, dynamic: DynamicResult) -> Figure:
    """Mean power spectrum of the decoded codes, with the signal and its first harmonics marked."""
    figure, (axes,) = new_figure()
    frequency = (
        np.arange(dynamic.spectrum_db.size)
        * plan.converter.sample_rate
        / dynamic.samples
    )
    scale, unit = (1e9, "GHz") if plan.converter.sample_rate >= 1e9 else (1e6, "MHz")
    shown = _peaks(dynamic.spectrum_db, 2048)
    axes.plot(
        frequency[shown] / scale,
        dynamic.spectrum_db[shown],
        color=COLOURS[0],
        linewidth=0.6,
    )
    for harmonic in range(1, 6):
        folded = harmonic * dynamic.cycles % dynamic.samples
        bin_ = min(folded, dynamic.samples - folded)
        axes.plot(
            frequency[bin_] / scale,
            dynamic.spectrum_db[bin_],
            "o",
            color=COLOURS[1],
            markersize=4,
        )
        axes.annotate(
            "signal" if harmonic == 1 else f"H{harmonic}",
            (frequency[bin_] / scale, dynamic.spectrum_db[bin_]),
            xytext=(0, 5),
            textcoords="offset points",
            ha="center",
            fontsize=8,
        )
    floor = np.percentile(dynamic.spectrum_db[1:], 5)
    axes.set_ylim(max(floor - 5, -140), 12)
    axes.set_xlim(0, frequency[-1] / scale)
    axes.set_xlabel(f"frequency [{unit}]")
    axes.set_ylabel("power against the signal [dB]")
    return figure


def _peaks(values: np.ndarray, wanted: int) -> np.ndarray:
    """Indices of the largest value in each of about `wanted` groups, so that no spur is lost in a small drawing."""
    group = max(1, values.size // wanted)
    whole = values[: values.size // group * group].reshape(-1, group)
    return whole.argmax(axis=1) + group * np.arange(whole.shape[0])


def bubble_figure(dynamic: DynamicResult) -> Figure:
    """How many bubbles of each order were seen."""
    figure, (axes,) = new_figure(height=2.6)
    total = dynamic.arrays * dynamic.samples
    orders = sorted(dynamic.bubbles_by_order)
    if orders:
        counts = [dynamic.bubbles_by_order[order] for order in orders]
        axes.bar(
            range(len(orders)),
            [count / total for count in counts],
            width=0.6,
            color=COLOURS[0],
        )
        for place, count in enumerate(counts):
            axes.annotate(
                str(count),
                (place, count / total),
                xytext=(0, 3),
                textcoords="offset points",
                ha="center",
                fontsize=8,
            )
        axes.set_xticks(range(len(orders)), [str(order) for order in orders])
        axes.set_xlim(-0.6, max(len(orders), 4) - 0.4)
        axes.set_yscale("log")
        axes.set_ylim(0.3 / total, max(counts) / total * 6)
    else:
        axes.text(0.5, 0.5, "no bubble was seen", transform=axes.transAxes, ha="center")
        axes.set_xticks([])
        axes.set_yticks([])
    axes.set_xlabel("order: decisions in a row that are wrong")
    axes.set_ylabel("bubbles per conversion")
    axes.set_title(f"in {total} conversions", fontsize=9, loc="left")
    axes.grid(axis="x", visible=False)
    return figure
