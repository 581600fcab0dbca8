"""Figures of a sweep: a curve for one axis, a contour map for two, with the goal line drawn in."""

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from flashplan.plan.axis import Axis
from flashplan.plan.model import Plan
from flashplan.report.drawing import BAD, COLOURS, INK, new_figure
from flashplan.sweep import SweepResult

_FLOOR = 1e-300  # a word error rate of zero has no place on a logarithmic axis


def sweep_figure(plan: Plan, result: SweepResult) -> Figure:
    """Yield, effective bits and word error rate along the axes, with the goals; more than two axes have no figure.

    Raises ValueError for more than two axes.
    """
    if len(result.axes) > 2:
        raise ValueError("a figure takes one or two axes")
    goals = plan.goals
    quantities = (
        (
            "exact yield",
            np.array([p.yield_ for p in result.points], dtype=float),
            goals.yield_,
        ),
        (
            "effective bits",
            np.array([p.enob_low for p in result.points], dtype=float),
            goals.enob,
        ),
        (
            "log10 word error rate",
            _log([p.word_error_rate for p in result.points]),
            float(np.log10(goals.word_error_rate)),
        ),
    )
    figure, panels = new_figure(3, 7.2 if len(result.axes) == 1 else 9.0)
    for axes, (name, values, goal) in zip(panels, quantities, strict=True):
        if len(result.axes) == 1:
            _curve(axes, result.axes[0], name, values, goal)
        else:
            _map(figure, axes, result, name, values, goal)
    panels[-1].set_xlabel(_label(result.axes[-1]))
    return figure


def _curve(axes: Axes, axis: Axis, name: str, values: np.ndarray, goal: float) -> None:
    axes.plot(axis.values, values, "o-", color=COLOURS[0], markersize=4)
    axes.axhline(goal, color=BAD, linestyle="--", linewidth=1)
    axes.annotate(
        "goal",
        (1.0, goal),
        xycoords=("axes fraction", "data"),
        xytext=(-2, 3),
        textcoords="offset points",
        ha="right",
        color=BAD,
        fontsize=8,
    )
    axes.set_ylabel(name)
    _scale(axes.set_xscale, axis)


def _map(
    figure: Figure,
    axes: Axes,
    result: SweepResult,
    name: str,
    values: np.ndarray,
    goal: float,
) -> None:
    vertical, horizontal = result.axes
    grid = np.ma.masked_invalid(
        values.reshape(len(vertical.values), len(horizontal.values))
    )
    mesh = axes.pcolormesh(
        horizontal.values, vertical.values, grid, cmap="cividis", shading="nearest"
    )
    if grid.count() and grid.min() < goal < grid.max() and min(grid.shape) > 1:
        lines = axes.contour(
            horizontal.values,
            vertical.values,
            grid,
            levels=[goal],
            colors=[BAD],
            linewidths=1.6,
        )
        axes.clabel(lines, fmt={goal: "goal"}, fontsize=8)
    figure.colorbar(mesh, ax=axes, label=name)
    axes.set_ylabel(_label(vertical))
    axes.grid(visible=False)
    _scale(axes.set_xscale, horizontal)
    _scale(axes.set_yscale, vertical)
    axes.tick_params(colors=INK)


def _label(axis: Axis) -> str:
    return f"{axis.key} [{axis.unit}]" if axis.unit not in ("", "ratio") else axis.key


def _scale(setter: object, axis: Axis) -> None:
    values = np.array(axis.values, dtype=float)
    if (
        values.size > 2
        and (values > 0).all()
        and np.allclose(np.diff(np.log(values)), np.log(values[1] / values[0]))
    ):
        setter("log")  # type: ignore[operator]


def _log(values: list[float | None]) -> np.ndarray:
    return np.log10(np.maximum(np.array(values, dtype=float), _FLOOR))
