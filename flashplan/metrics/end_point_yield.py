"""Yield when DNL and INL are taken from the line through the first and the last threshold."""

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.offset_density import OffsetDensity
from flashplan.metrics.resistor_bridge import make_bridge, modes_needed
from flashplan.metrics.threshold_chain import Stretch, make_band, stepped_chain

# Spacing of the outer offsets in units of the density's width, and their largest distance from zero.
_SPACING = 0.5
_RADIUS = 6.5


def end_point_yield(
    bits: int,
    density: OffsetDensity,
    dnl: float,
    inl: float,
    resistor_sigma: float,
    systematic: NDArray[np.float64],
    refine: int = 0,
) -> tuple[float, float]:
    """Return loss and yield; arguments as linearity_yield's.

    Given the outer offsets (first, last), the inner thresholds' distances from their line, in units of the fitted
    LSB, form a chain in a band and a box that do not depend on the line; only the density under them shifts. The part
    of the string between the outer taps is a pinned string of its own, so the outer taps' movement only changes the
    fitted LSB. The average over (first, last) is a trapezoidal sum, which converges exponentially for a density that
    is smooth and dies out.
    """
    steps = 2**bits - 2
    first, last, weight = _outer_offsets(density, refine)
    tilt = np.arange(1, steps) / steps
    fixed = systematic - np.interp(
        np.arange(steps + 1), [0, steps], [systematic[0], systematic[-1]]
    )
    stretching, share = _outer_taps(2**bits, resistor_sigma)
    first, last = np.repeat(first, len(share)), np.repeat(last, len(share))
    weight = np.repeat(weight, len(share)) * np.tile(share, len(weight))
    gain = 1.0 + (last - first + systematic[-1] - systematic[0]) / steps
    gain += np.tile(stretching, len(weight) // len(share))
    line = first + np.outer(tilt, last - first) - fixed[1:-1, np.newaxis]
    spread = 0.5 * resistor_sigma * np.sqrt(steps)
    farthest = density.reach + 6 * spread + np.abs(first).max() + np.abs(fixed).max()
    band = make_band(min(inl, farthest), dnl, density, hard=(0.0,), refine=refine)
    bridge = make_bridge(
        steps, resistor_sigma, modes_needed(spread, density.width) + 4 * refine
    )
    loss, survive = stepped_chain(
        band, density, Stretch(line, gain, bridge, 1, tied=True)
    )
    return float(weight @ loss), float(weight @ survive)


def _outer_offsets(
    density: OffsetDensity, refine: int
) -> tuple[NDArray, NDArray, NDArray]:
    """First and last offset and their joint weight, three (columns,), weights summing to one."""
    spacing = _SPACING / (1 + 0.3 * refine)
    count = int(np.ceil(_RADIUS / spacing))
    points = (np.arange(-count, count) + 0.5) * spacing * density.width
    chance = density.pdf(points) * spacing * density.width
    first, last = (v.ravel() for v in np.meshgrid(points, points, indexing="ij"))
    weight = np.outer(chance, chance).ravel()
    keep = first**2 + last**2 < (_RADIUS * density.width) ** 2
    return first[keep], last[keep], weight[keep] / weight[keep].sum()


def _outer_taps(units: int, resistor_sigma: float) -> tuple[NDArray, NDArray]:
    """What the outer taps' movement adds to the fitted LSB, as a three-point rule: values in LSB and weights."""
    if resistor_sigma == 0:
        return np.zeros(1), np.ones(1)
    sigma = resistor_sigma * np.sqrt(2.0 / (units * (units - 2.0)))
    return sigma * np.sqrt(3.0) * np.array([-1.0, 0.0, 1.0]), np.array([1, 4, 1]) / 6.0
