"""Yield of a resistor string without any comparator offset."""

import numpy as np
from numpy.typing import NDArray
from scipy.fft import dst
from scipy.special import ndtri
from scipy.stats import qmc

from flashplan.metrics.linearity import Fit
from flashplan.metrics.static_run import judge_arrays

# Points of the Sobol sequence, a power of two, and how many values are worked on at a time.
_POINTS = 2**14
_BLOCK = 2**22


def string_alone_yield(
    bits: int,
    dnl: float,
    inl: float,
    fit: Fit,
    resistor_sigma: float,
    systematic: NDArray[np.float64],
) -> float:
    """Return the part of pinned strings that meet both goals, by a Sobol sequence of their movements.

    Arguments as linearity_yield's. The string's covariance has sines for eigenvectors, sin(pi j k / m), with variance
    (sigma / (2 sin(pi j / 2m)))^2, so few of the sequence's coordinates carry nearly all of it. Absolute error 2e-3
    at most, no random draw.
    """
    units = 2**bits
    mode = np.arange(1, units)
    size = resistor_sigma / (2 * np.sin(np.pi * mode / (2 * units)))
    sequence = qmc.Sobol(units - 1, scramble=False)
    chunk, passed = min(_POINTS, _BLOCK // units), 0
    for _ in range(_POINTS // chunk):
        normals = ndtri(sequence.random(chunk) + 0.5 / _POINTS)
        errors = dst(normals * size, type=1, norm="ortho", axis=1) + systematic
        passed += int(judge_arrays(errors, fit, dnl, inl).passed.sum())
    return passed / _POINTS
