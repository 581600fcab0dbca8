"""Random mismatch of MOS devices: the area law, and draws from it."""

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]


def pair_sigma(matching: ArrayLike, width: ArrayLike, length: ArrayLike) -> Floats:
    """Standard deviation of the difference of a matched pair: A / sqrt(W L).

    matching: A_VT in V m (result in V) or A_beta in m (result relative); width and length in m; all broadcast.
    Raises ValueError for a size that is not positive.
    Source: M. J. M. Pelgrom, A. C. J. Duinmaijer, A. P. G. Welbers, "Matching properties of MOS transistors",
    IEEE J. Solid-State Circuits 24(5), 1989.

    >>> print(f"{float(pair_sigma(30e-9, 20e-6, 20e-6)) * 1e3:.3f} mV")
    1.500 mV
    """
    area = np.asarray(width, dtype=float) * np.asarray(length, dtype=float)
    if np.any(np.asarray(width) <= 0) or np.any(np.asarray(length) <= 0):
        raise ValueError("width and length must be positive")
    return np.asarray(matching) / np.sqrt(area)


def device_sigma(matching: ArrayLike, width: ArrayLike, length: ArrayLike) -> Floats:
    """Standard deviation of one device against the mean: that of a pair's difference over sqrt(2)."""
    return pair_sigma(matching, width, length) / np.sqrt(2.0)


def draw_mismatch(
    sigma: Floats, instances: int, generator: np.random.Generator
) -> Floats:
    """Independent normal draws, (devices, instances), for each device's own sigma, (devices,)."""
    return sigma[:, None] * generator.standard_normal((sigma.size, instances))
