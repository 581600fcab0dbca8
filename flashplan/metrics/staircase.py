"""Error power of any static staircase under an input with any density."""

import math
from collections.abc import Callable
from itertools import pairwise
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike


class Density(Protocol):
    """How an input is spread; a frozen continuous distribution of scipy.stats is one."""

    def support(self) -> tuple[float, float]:
        """Ends of the range that the input stays in."""

    def expect(self, func: Callable[[float], float], *, lb: float, ub: float) -> float:
        """Integral of func times the density from lb to ub."""


def staircase_error_power(
    thresholds: ArrayLike, levels: ArrayLike, density: Density
) -> float:
    """Return the mean of (x - output(x))**2 over the input's density, in squared units of the input.

    thresholds: (M,), not falling; levels: (M + 1,), the output between them. Each step is integrated by itself, to
    about 1e-8 of its share. Raises ValueError for falling thresholds or another number of levels.
    Source: definition of the mean square error.

    >>> from scipy.stats import uniform
    >>> power = staircase_error_power([1, 2, 3], [0.5, 1.5, 2.5, 3.5], uniform(0, 4))
    >>> print(f"{12 * power:.6f}")
    1.000000
    """
    steps = np.asarray(thresholds, dtype=np.float64)
    outputs = np.asarray(levels, dtype=np.float64)
    if np.any(np.diff(steps) < 0) or outputs.size != steps.size + 1:
        raise ValueError(
            "the thresholds must not fall, and there must be one level more than thresholds"
        )
    lowest, highest = density.support()
    edges = [lowest, *np.clip(steps, lowest, highest).tolist(), highest]

    def squared_error(level: float) -> Callable[[float], float]:
        return lambda x: (x - level) ** 2

    return math.fsum(
        density.expect(squared_error(level), lb=low, ub=high)
        for (low, high), level in zip(pairwise(edges), outputs.tolist(), strict=True)
        if high > low
    )
