"""Tap errors of a string of mismatched resistors between two fixed ends: a random walk pinned at both."""

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.sine import sine_weights

# The shape of the spectrum has reached its continuous limit at this many bits.
_LIMIT_BITS = 8


def walk_variance(bits: int) -> NDArray[np.float64]:
    """Variance of each tap in LSB^2 for a relative sigma of 1 of one unit resistor: (2**bits - 1,).

    k (m - k) / m with m = 2**bits units; at the middle the sigma is sqrt(m) / 2.
    Source: random walk with pinned ends, closed form.
    """
    tap = np.arange(1, 2**bits)
    return tap * (2**bits - tap) / 2**bits


def walk_power(bits: int) -> float:
    """Mean error power of a full-scale sine, in LSB^2, for a relative sigma of 1 of one unit resistor."""
    return float((sine_weights(bits) * walk_variance(bits)).sum())


def walk_spectrum(bits: int) -> NDArray[np.float64]:
    """Weights of the squared normals that make up the walk's error power in one array; they sum to 1.

    The taps' covariance is min(j, k) - j k / m, weighted by the sine; the weights are its eigenvalues. Above 8 bits
    those of 8 bits are returned, which differ by under 1 %.
    """
    bits = min(bits, _LIMIT_BITS)
    tap = np.arange(1, 2**bits)
    covariance = np.minimum.outer(tap, tap) - np.multiply.outer(tap, tap) / 2**bits
    root = np.sqrt(sine_weights(bits))
    spectrum = np.maximum(np.linalg.eigvalsh(root[:, None] * covariance * root), 0.0)
    return np.asarray(spectrum / spectrum.sum())
