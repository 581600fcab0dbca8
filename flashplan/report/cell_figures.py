"""Figures of one comparator cell: delay, waveforms, trip points, offsets, and what each device contributes."""

import numpy as np
from matplotlib.figure import Figure
from scipy import stats

from flashplan.cell.bench.offset import OffsetDistribution
from flashplan.cell.bench.regeneration import DelayCurve, Regeneration
from flashplan.cell.bench.setup import Decision, Setup
from flashplan.cell.bench.transfer import TripPoints
from flashplan.cell.sized import SizedCell
from flashplan.quantity import show
from flashplan.report.drawing import COLOURS, INK, QUIET, new_figure


def delay_figure(
    curve: DelayCurve, regeneration: Regeneration, valid_level: float
) -> Figure:
    """Decision delay against overdrive, and the exponential law that tau, gain and delay stand for.

    valid_level: differential output in V that the law is taken to.
    """
    figure, (axes,) = new_figure()
    law = regeneration.delay + regeneration.tau * np.log(
        valid_level / (regeneration.gain * curve.overdrive)
    )
    axes.plot(
        curve.overdrive * 1e3,
        law * 1e12,
        color=QUIET,
        linewidth=1.4,
        label=f"law: tau {show(regeneration.tau, 's', 3)}, gain {regeneration.gain:.3g},"
        f" delay {show(regeneration.delay, 's', 3)}",
    )
    axes.plot(
        curve.overdrive * 1e3,
        curve.delay * 1e12,
        "o",
        color=COLOURS[0],
        markersize=5,
        label="transient",
    )
    axes.set_xscale("log")
    axes.set_ylim(bottom=0)
    axes.set_xlabel("overdrive (mV)")
    axes.set_ylabel("delay from clock edge (ps)")
    axes.legend(frameon=False)
    return figure


def waveform_figure(setup: Setup, decision: Decision, overdrive: np.ndarray) -> Figure:
    """Both outputs of a decision at several overdrives in V, (instances,): solid the one that goes high."""
    figure, (axes,) = new_figure()
    rows = [
        setup.network.circuit.free.index(name) for name in setup.network.circuit.outputs
    ]
    for k, value in enumerate(np.atleast_1d(overdrive)):
        colour = COLOURS[k % len(COLOURS)]
        first, second = (decision.trajectory.voltages[:, row, k] for row in rows)
        axes.plot(
            decision.time * 1e12, first, color=colour, label=show(float(value), "V", 3)
        )
        axes.plot(decision.time * 1e12, second, color=colour, linestyle="--")
    axes.axvline(0.0, color=INK, linewidth=0.8)
    axes.set_xlabel("time from clock edge (ps)")
    axes.set_ylabel("outputs (V)")
    axes.legend(title="overdrive", frameon=False, loc="center right")
    return figure


def trip_figure(trips: TripPoints, supply: float) -> Figure:
    """The loop of a continuous cell: output against input, upward and downward, at the mean trip points of the draws.

    Ticks below and above the loop show the trip points of the single draws.
    """
    figure, (axes,) = new_figure()
    good = ~trips.failed
    up, down = trips.up[good] * 1e3, trips.down[good] * 1e3
    reach = 1.6 * max(np.abs(np.concatenate([up, down])).max(), 1e-3)
    for points, levels, colour, name in (
        (up, (0.0, supply), COLOURS[0], "rising input"),
        (down, (supply, 0.0), COLOURS[1], "falling input"),
    ):
        sign = 1.0 if levels[0] == 0.0 else -1.0
        middle = float(points.mean())
        axes.plot(
            [-sign * reach, middle, middle, sign * reach],
            [levels[0], levels[0], levels[1], levels[1]],
            color=colour,
            label=f"{name}: {middle:.3g} mV",
        )
        foot = -0.09 * supply if sign > 0 else 1.09 * supply
        axes.plot(points, np.full(points.size, foot), "|", color=colour, markersize=9)
    axes.set_xlabel("input against reference (mV)")
    axes.set_ylabel("output (V)")
    axes.set_ylim(-0.16 * supply, 1.16 * supply)
    axes.legend(frameon=False, loc="center left")
    return figure


def offset_figure(offsets: OffsetDistribution) -> Figure:
    """Histogram of the drawn offsets with the normal distribution of the same mean and sigma."""
    figure, (axes,) = new_figure()
    values = offsets.offsets * 1e3
    count, edges, _ = axes.hist(
        values, bins="fd", color=COLOURS[5], edgecolor="white", linewidth=0.5
    )
    x = np.linspace(edges[0], edges[-1], 200)
    scale = values.size * (edges[1] - edges[0])
    axes.plot(
        x,
        scale * stats.norm.pdf(x, offsets.mean * 1e3, offsets.sigma * 1e3),
        color=INK,
        linewidth=1.4,
        label=f"normal: sigma {show(offsets.sigma, 'V', 3)}"
        f" ({offsets.low * 1e3:.3g} to {offsets.high * 1e3:.3g} mV)",
    )
    axes.set_ylim(0, 1.25 * float(np.max(count)))
    axes.set_xlabel(f"offset of {values.size} draws (mV)")
    axes.set_ylabel("draws")
    axes.legend(frameon=False, loc="upper right")
    return figure


def contribution_figure(cell: SizedCell) -> Figure:
    """What each group of devices contributes to offset and noise (as variance) and to the energy of a decision."""
    figure, axes = new_figure(3, 5.4)
    names = [f"{d.name} ({d.count} x {show(d.width, 'm', 3)})" for d in cell.devices]
    parts = (
        ("offset variance", [d.offset_sigma**2 for d in cell.devices], COLOURS[0]),
        ("noise variance", [d.noise_sigma**2 for d in cell.devices], COLOURS[1]),
        ("energy in devices", [d.energy for d in cell.devices], COLOURS[2]),
    )
    for axis, (title, values, colour) in zip(axes, parts, strict=True):
        share = 100.0 * np.array(values) / max(sum(values), 1e-300)
        axis.barh(range(len(names)), share, color=colour, height=0.65)
        for place, part in enumerate(share):
            axis.annotate(
                f"{part:.0f} %" if part >= 0.5 else "< 0.5 %",
                (part, place),
                xytext=(4, 0),
                textcoords="offset points",
                va="center",
                fontsize=8,
            )
        axis.set_yticks(range(len(names)), names)
        axis.invert_yaxis()
        axis.set_xlim(0, 112)
        axis.grid(axis="y", visible=False)
        axis.set_xlabel(f"share of {title} (%)")
    return figure
