"""The ideal quantiser under a full-scale sine: what a converter's measured effective bits can reach at best."""

import math
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.sine import sine_positions

F = TypeVar("F", float, NDArray[np.float64])

_DB_PER_BIT = 20.0 * math.log10(2.0)
_DB_OF_A_SINE = 10.0 * math.log10(1.5)


def sndr_from_enob(enob: float) -> float:
    """SNDR in dB that stands for a number of effective bits: 20 log10(2) ENOB + 10 log10(1.5).

    Source: IEEE Std 1241 (memory).

    >>> print(f"{sndr_from_enob(6):.2f}")
    37.88
    """
    return _DB_PER_BIT * enob + _DB_OF_A_SINE


def enob_from_sndr(sndr_db: F) -> F:
    """Effective bits that an SNDR in dB stands for; the inverse of `sndr_from_enob`."""
    return (sndr_db - _DB_OF_A_SINE) / _DB_PER_BIT


def ideal_powers(bits: int) -> tuple[float, float]:
    """Power of the fitted sine and error power about it, both in LSB^2, of an ideal quantiser's full-scale sine.

    The output is the sum of unit steps at the thresholds, so with x_k the thresholds in amplitudes, the fundamental is
    b = (2 / pi) sum sqrt(1 - x_k^2), the mean sum P_k and the mean square sum (2 k - 1) P_k, where
    P_k = arccos(x_k) / pi is the part of time above threshold k; signal b^2 / 2, error what is left of the variance.
    Source: Fourier coefficients of a sine through a staircase; W. R. Bennett, "Spectra of quantized signals", Bell
    Syst. Tech. J. 27, 1948 (memory).
    """
    position = sine_positions(bits)
    above = np.arccos(position) / np.pi
    signal = (2.0 / np.pi * np.sqrt(1.0 - position**2).sum()) ** 2 / 2.0
    variance = ((2.0 * np.arange(1, 2**bits) - 1.0) * above).sum() - above.sum() ** 2
    return float(signal), float(variance - signal)


def ideal_error_power_lsb2(bits: int) -> float:
    """Error power about the fitted sine in LSB^2; near 1/12, but not on it at few bits.

    >>> print(f"{ideal_error_power_lsb2(6) * 12:.4f}")
    1.0386
    """
    return ideal_powers(bits)[1]


def ideal_sndr_db(bits: int) -> float:
    """SNDR of the ideal quantiser with a fitted full-scale sine, in dB; a little below 6.02 N + 1.76.

    >>> print(f"{ideal_sndr_db(6):.2f}")
    37.70
    """
    signal, error = ideal_powers(bits)
    return 10.0 * math.log10(signal / error)
