"""Quantiles of a weighted sum of squared standard normals: how much an array's own error power scatters."""

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq
from scipy.stats import norm


def quadratic_form_quantile(probability: float, weights: ArrayLike) -> float:
    """The level that sum_i weights_i z_i**2 stays below with `probability`, in the weights' unit.

    weights: positive, any shape; z_i independent standard normals. Saddlepoint approximation with the tail formula of
    Lugannani and Rice; above 90 % it agrees with chi-square tables to 0.6 % for one weight and 0.01 % for fifteen.
    The cost is linear in the number of weights. Raises ValueError unless 0 < probability < 1.
    Source: D. Kuonen, "Saddlepoint approximations for distributions of quadratic forms in normal variables",
    Biometrika 86(4), 1999 (memory).

    >>> print(f"{quadratic_form_quantile(0.99, np.ones(63)):.2f}")     # chi-square table: 92.01
    92.01
    """
    if not 0 < probability < 1:
        raise ValueError("probability must be between 0 and 1, exclusive")
    values = np.ravel(np.asarray(weights, dtype=float))
    largest = values.max(initial=0.0)
    values = values[values > largest * 1e-12]
    if values.size == 0:
        return 0.0
    scaled = values / largest

    # The saddlepoint t itself is the unknown, from -inf to 1/2, so that no root is nested in another.
    def excess(position: float) -> float:
        return _distribution(_saddlepoint(position), scaled) - probability

    low, high = -1.0, 1.0
    while excess(low) > 0:
        low *= 2.0
    while excess(high) < 0:
        high *= 2.0
    t = _saddlepoint(float(brentq(excess, low, high, xtol=1e-12)))
    return float((scaled / (1.0 - 2.0 * t * scaled)).sum() * largest)


def _saddlepoint(position: float) -> float:
    """Map the whole line to t < 1/2, smoothly and with t(0) = 0."""
    return 0.5 * -np.expm1(-position)


def _distribution(t: float, scaled: NDArray[np.float64]) -> float:
    """P(form <= level) where the level is the one with saddlepoint t."""
    spread = 1.0 - 2.0 * t * scaled
    ratio = scaled / spread
    level, variance = ratio.sum(), 2.0 * (ratio**2).sum()
    deviance = 2.0 * (t * level + 0.5 * np.log(spread).sum())
    if (
        deviance < 1e-8
    ):  # both terms of the formula blow up at the mean and cancel to this
        skewness = 8.0 * (ratio**3).sum() / variance**1.5
        return float(0.5 + skewness / (6.0 * np.sqrt(2.0 * np.pi)))
    w = np.sign(t) * np.sqrt(deviance)
    u = t * np.sqrt(variance)
    return float(norm.cdf(w) + norm.pdf(w) * (1.0 / w - 1.0 / u))
