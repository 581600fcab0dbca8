"""Profile-likelihood intervals of one of two spreads, neither of which can be below zero."""

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq, minimize_scalar

Floats = NDArray[np.float64]


class Profile(NamedTuple):
    """An estimate with its interval."""

    value: float
    low: float
    high: float


def profile_interval(
    likelihood: Callable[[Floats], float],
    best: Floats,
    which: int,
    drop: float,
    scale: float,
) -> Profile:
    """Where the log-likelihood, at its best over the other spread, has dropped by `drop`; from zero where it has not.

    likelihood: of (2,) spreads; best: where it is largest; scale: a spread that is certainly seen.
    Source: D. J. Venzon, S. H. Moolgavkar, Appl. Statist. 37, 1988 (memory).
    """
    top = likelihood(best)
    other = 1 - which

    def fallen(spread: float) -> float:
        def cost(free: float) -> float:
            pair = np.empty(2)
            pair[which], pair[other] = spread, free
            return -likelihood(pair)

        reach = 3 * best[other] + scale
        found = minimize_scalar(
            cost, bounds=(0.0, reach), method="bounded", options={"xatol": 1e-3 * reach}
        )
        return top - max(-float(found.fun), -cost(0.0), -cost(best[other])) - drop

    value = float(best[which])
    low = (
        0.0
        if fallen(0.0) < 0 or value == 0
        else float(brentq(fallen, 0.0, value, rtol=1e-3))
    )
    high = value + scale
    for _ in range(20):
        if fallen(high) > 0:
            return Profile(value, low, float(brentq(fallen, value, high, rtol=1e-3)))
        high *= 2
    return Profile(value, low, high)
