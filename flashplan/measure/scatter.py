"""What scatters from sample to sample: noise, the same at every slope, and jitter, which grows with the slope."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import Bounds, minimize

Floats = NDArray[np.float64]


def scatter(sigma: Floats, slope_square: Floats, floor: float) -> Floats:
    """Total scatter in LSB where the slope's square against the largest is (K,): sqrt(noise^2 + slope^2 jitter^2).

    sigma: noise and jitter at the largest slope, in LSB; floor: spacing of the samples there, in LSB. Far below it no
    record tells the scatter, so that the result levels out there, and hardly feels the floor above it.

    >>> scatter(np.array([3.0, 4.0]), np.array([0.0, 1.0]), 0.0)
    array([3., 5.])
    """
    told = sigma[0] ** 2 + sigma[1] ** 2 * slope_square
    return (told**2 + (floor**2 * slope_square) ** 2 + 1e-40) ** 0.25


def scatter_likelihood(
    guess: Floats,
    slope_square: Floats,
    floor: float,
    score: Floats,
    information: Floats,
) -> Callable[[Floats], float]:
    """Log-likelihood of (noise, jitter) in LSB, to second order in the logarithm of each comparator's scatter.

    guess: the two that score and information, each (K,), were worked out about.
    """
    before = np.log(scatter(guess, slope_square, floor))

    def likelihood(sigma: Floats) -> float:
        change = np.log(scatter(sigma, slope_square, floor)) - before
        return float(score @ change - 0.5 * information @ change**2)

    return likelihood


def fit_scatter(likelihood: Callable[[Floats], float], guess: Floats) -> Floats:
    """Noise and jitter that the log-likelihood likes best, a factor of four from the guess at most."""
    size = float(np.hypot(*guess)) + 1e-12

    def cost(part: Floats) -> float:
        return -likelihood(part * size)

    start = np.maximum(guess / size, 0.05)
    found = minimize(cost, start, method="L-BFGS-B", bounds=Bounds([0, 0], [4, 4]))
    return np.asarray(found.x, dtype=float) * size
