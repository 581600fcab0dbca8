"""How a full-scale sine visits the thresholds of an ideal converter."""

import numpy as np
from numpy.typing import NDArray


def sine_positions(bits: int) -> NDArray[np.float64]:
    """Thresholds as seen from the middle of a full-scale sine, in amplitudes: (2**bits - 1,), from -1 to 1, exclusive.

    >>> sine_positions(2)
    array([-0.5,  0. ,  0.5])
    """
    return np.arange(1, 2**bits) / 2 ** (bits - 1) - 1.0


def sine_weights(bits: int) -> NDArray[np.float64]:
    """Weight of each threshold's squared error in the error power of a full-scale sine: (2**bits - 1,).

    w_k = LSB p(T_k), with p the arcsine density of the sine. A threshold moved by e LSB adds w_k e**2 LSB**2. The sum
    is a little below 1, since the sine also dwells beyond the outer thresholds, where there is nothing to move.
    Source: W. R. Bennett, "Spectra of quantized signals", Bell Syst. Tech. J. 27, 1948 (density of a sine; memory).

    >>> print(f"{sine_weights(6).sum():.3f}")
    0.884
    """
    return 1.0 / (np.pi * 2 ** (bits - 1) * np.sqrt(1.0 - sine_positions(bits) ** 2))


def sine_slews(bits: int, full_scale: float, frequency: float) -> NDArray[np.float64]:
    """Magnitude of a full-scale sine's slope where it crosses each threshold, in V/s: (2**bits - 1,).

    full_scale in V (twice the amplitude), frequency in Hz.
    """
    return np.pi * frequency * full_scale * np.sqrt(1.0 - sine_positions(bits) ** 2)
