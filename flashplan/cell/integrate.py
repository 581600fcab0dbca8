"""Many instances of one set of equations advanced at once, with error control on the worst of them."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

# J. R. Dormand, P. J. Prince, J. Comput. Appl. Math. 6(1), 1980: fifth order, with an embedded fourth-order estimate.
_NODES = (0.0, 1 / 5, 3 / 10, 4 / 5, 8 / 9, 1.0)
_STAGES: tuple[tuple[float, ...], ...] = (
    (),
    (1 / 5,),
    (3 / 40, 9 / 40),
    (44 / 45, -56 / 15, 32 / 9),
    (19372 / 6561, -25360 / 2187, 64448 / 6561, -212 / 729),
    (9017 / 3168, -355 / 33, 46732 / 5247, 49 / 176, -5103 / 18656),
)
_FIFTH = (35 / 384, 0.0, 500 / 1113, 125 / 192, -2187 / 6784, 11 / 84)
_ERROR = (
    71 / 57600,
    0.0,
    -71 / 16695,
    71 / 1920,
    -17253 / 339200,
    22 / 525,
    -1 / 40,
)


@dataclass(frozen=True)
class Trajectory:
    """Accepted steps of a run: time (steps,), voltages (steps, nodes, instances), failed (instances,).

    A failed instance is one whose equations gave no finite value, or that the smallest step could not follow; its
    voltages are held from there on.
    """

    time: Floats
    voltages: Floats
    failed: NDArray[np.bool_]


def integrate(
    slope: Callable[[float, Floats], Floats],
    start: Floats,
    times: tuple[float, float],
    tolerance: float,
    breaks: Sequence[float] = (),
    stop: Callable[[float, Floats], bool] | None = None,
    largest_step: float = np.inf,
) -> Trajectory:
    """Advance all instances with one step that suits the worst of them, by Dormand and Prince's pair.

    slope: f(t, v) with v (nodes, instances); start: (nodes, instances) at times[0]; tolerance: largest local error of
    any node of any instance per step; breaks: times to land on (corners of the drive); stop: ends the run early when
    true of an accepted step. Instances of one circuit are alike, so that one step costs little against steps of
    their own and keeps every operation on whole arrays.
    """
    time, end = times
    marks = sorted(b for b in breaks if time < b < end) + [end]
    state = np.array(start, dtype=float)
    failed = np.zeros(state.shape[1], dtype=bool)
    rates = _finite(slope(time, state), failed)
    span = end - time
    smallest = span * 1e-9
    step = _first_step(rates, tolerance, span)
    kept_time, kept = [time], [state.copy()]
    while time < end:
        mark = next(m for m in marks if m > time)
        step = min(step, largest_step)
        landing = time + step >= mark - smallest
        h = mark - time if landing else step
        stages = [rates]
        for node, weights in zip(_NODES[1:], _STAGES[1:], strict=True):
            stages.append(
                _finite(
                    slope(time + node * h, _advance(state, h, weights, stages)), failed
                )
            )
        new = _advance(state, h, _FIFTH, stages)
        stages.append(_finite(slope(time + h, new), failed))
        error = np.abs(_combine(_ERROR, stages)) * h
        error[:, failed] = 0.0
        worst = float(error.max()) / tolerance
        if worst > 1.0 and h <= smallest:
            failed |= (error > tolerance).any(axis=0)
            for stage in stages:
                stage[:, failed] = 0.0
            rates = stages[0]
            continue
        if worst <= 1.0:
            time = mark if landing else time + h
            state, rates = new, stages[-1]
            kept_time.append(time)
            kept.append(state)
            if stop is not None and stop(time, state):
                break
        # A landing step may be far shorter than the error allows; it then must not set the pace.
        pace = step if landing and worst <= 1.0 else h
        step = pace * min(4.0, max(0.2, 0.9 * max(worst, 1e-8) ** -0.2))
        step = max(step, smallest)
    return Trajectory(np.array(kept_time), np.stack(kept), failed)


def _first_step(rates: Floats, tolerance: float, span: float) -> float:
    fastest = float(np.abs(rates).max(initial=0.0))
    return min(span / 50.0, 10.0 * tolerance / fastest if fastest > 0 else span / 50.0)


def _finite(rates: Floats, failed: NDArray[np.bool_]) -> Floats:
    """Rates with those of failed instances at zero; instances that are not finite are marked failed in place."""
    total = rates.sum()
    if not np.isfinite(total) or failed.any():
        failed |= ~np.isfinite(rates).all(axis=0)
        rates[:, failed] = 0.0
    return rates


def _combine(weights: Sequence[float], stages: Sequence[Floats]) -> Floats:
    total: Floats = weights[0] * stages[0]
    for weight, stage in zip(weights[1:], stages[1:], strict=True):
        if weight:
            total += weight * stage
    return total


def _advance(
    state: Floats, h: float, weights: Sequence[float], stages: Sequence[Floats]
) -> Floats:
    total = _combine(weights, stages[: len(weights)])
    total *= h
    total += state
    return total
