"""The search for sizes: least energy, then area, inside every limit."""

from collections.abc import Callable
from contextlib import suppress
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import Bounds, minimize

Floats = NDArray[np.float64]

# Objective and excesses ln(value / limit) of several points: (points,), (limits, points).
Model = Callable[[list[Floats]], tuple[Floats, Floats]]

_STEP = 0.02  # of a logarithm, for the difference quotients; far above what the model's step control jitters by
_PENALTY = 30.0  # of an excess against ln(energy): an exact penalty as long as multipliers stay below it


@dataclass(frozen=True)
class Optimum:
    """x at the best point; excess of each limit there (limits,); slopes of the excesses (limits, variables)."""

    x: Floats
    objective: float
    excess: Floats
    slopes: Floats
    evaluations: int


def optimise(
    model: Model,
    start: Floats,
    bounds: list[tuple[float, float]],
    evaluations: int = 20,
    reach: float = 1.5,
) -> Optimum:
    """Minimise the objective with each excess at most its slack, and slacks (at least 0) at a price.

    The price makes every slack 0 if that can be; where it cannot, the sum of slacks tends to leave few limits broken
    instead of all of them a little, which tells a designer what stands in the way.
    Sequential quadratic programming (SLSQP); one call of the model gives a point and all its difference quotients.
    evaluations: the most calls of the model. reach: how far a logarithm may move from the start, so that the search stays where the model was corrected.
    """
    size = start.size
    low = np.maximum([b[0] for b in bounds], start - reach)
    high = np.minimum([b[1] for b in bounds], start + reach)
    kept: dict[bytes, tuple[float, Floats, Floats, Floats]] = {}

    def at(x: Floats) -> tuple[float, Floats, Floats, Floats]:
        key = x.tobytes()
        if key not in kept:
            if len(kept) >= evaluations:
                raise _Enough
            points = [x] + [x + _STEP * unit for unit in np.eye(size)]
            value, excess = model(points)
            kept[key] = (
                float(value[0]),
                (value[1:] - value[0]) / _STEP,
                excess[:, 0],
                (excess[:, 1:] - excess[:, :1]) / _STEP,
            )
        return kept[key]

    first = at(np.clip(start, low, high))
    limits = first[2].size

    def merit(value: float, excess: Floats) -> float:
        return value + _PENALTY * float(np.maximum(excess, 0.0).sum())

    with suppress(_Enough):
        minimize(  # type: ignore[call-overload]  # the stubs know no constraint's jac
            lambda z: at(z[:size])[0] + _PENALTY * float(z[size:].sum()),
            np.concatenate([np.clip(start, low, high), np.maximum(first[2], 0.0)]),
            jac=lambda z: np.append(at(z[:size])[1], np.full(limits, _PENALTY)),
            method="SLSQP",
            bounds=Bounds(
                np.append(low, np.zeros(limits)),
                np.append(high, np.full(limits, np.inf)),
            ),
            constraints={
                "type": "ineq",
                "fun": lambda z: z[size:] - at(z[:size])[2],
                "jac": lambda z: np.hstack([-at(z[:size])[3], np.eye(limits)]),
            },
            options={"maxiter": evaluations, "ftol": 2e-3},
        )
    # The solver may end on a point worse than one it has seen: what counts is the merit itself.
    best = min(kept, key=lambda k: merit(kept[k][0], kept[k][2]))
    objective, _, excess, slopes = kept[best]
    return Optimum(np.frombuffer(best).copy(), objective, excess, slopes, len(kept))


class _Enough(Exception):
    """The search has spent its evaluations."""
