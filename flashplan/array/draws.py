"""What is drawn once per array: threshold errors and sampling skew, and the error power that they cost."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.quadratic_form import quadratic_form_quantile
from flashplan.metrics.sine import sine_slews, sine_weights

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class FixedError:
    """Error power of what is drawn once per array, in LSB^2: of each drawn array, its mean and its yield's quantile."""

    drawn: Floats
    mean: float
    quantile: float


def fixed_error_power(
    bits: int,
    full_scale: float,
    frequency: float,
    threshold_errors: Floats,
    skews: Floats,
    offset_sigma_lsb: float,
    skew_sigma: float,
    mismatch_spectrum: Floats,
    probability: float,
) -> FixedError:
    """Error power of random threshold errors and skews under a full-scale sine.

    P = sum w e^2 + sum w slew^2 s^2. threshold_errors (arrays, M) in LSB, skews (arrays, M) in s, as drawn with the
    sigmas; mismatch_spectrum: weights in LSB^2 of the squared normals that the resistors add; probability: of the
    quantile over arrays.
    """
    weights = sine_weights(bits)
    timing = (
        weights * (sine_slews(bits, full_scale, frequency) * 2**bits / full_scale) ** 2
    )
    drawn = threshold_errors**2 @ weights + skews**2 @ timing
    parts = np.concatenate(
        [weights * offset_sigma_lsb**2, timing * skew_sigma**2, mismatch_spectrum]
    )
    return FixedError(
        drawn, float(parts.sum()), quadratic_form_quantile(probability, parts)
    )
