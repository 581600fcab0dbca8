"""Yield when DNL and INL are taken from the line through the first and the last threshold.

Given the outer offsets (x, y), the inner thresholds' distances from their line, in units of the fitted LSB, form a
chain in a band and a box that do not depend on the line; only the density under them shifts. What is left is an
average over x and y.
"""

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.band_operator import make_panels
from flashplan.metrics.end_point_string import string_yield
from flashplan.metrics.gaussian_path import still_path
from flashplan.metrics.long_chain import extrapolate, hazard, may_squeeze, resample
from flashplan.metrics.offset_density import NormalOffsets, OffsetDensity
from flashplan.metrics.threshold_chain import (
    Stretch,
    homogeneous_chain,
    make_band,
    stepped_chain,
)

Array = NDArray[np.float64]

# Spacing of the outer offsets, in units of the density's width.
_SPACING = 0.5
# Part of the loss that the outer offsets left out may carry.
_CUT = 5e-5


def end_point_yield(
    bits: int,
    density: OffsetDensity,
    dnl: float,
    inl: float,
    resistor_sigma: float,
    systematic: Array,
    refine: int = 0,
) -> tuple[float, float]:
    """Return loss and yield; arguments as linearity_yield's."""
    steps = 2**bits - 2
    ends = systematic[-1] - systematic[0]
    bow = systematic - systematic[0] - ends * np.arange(steps + 1) / steps
    mean_gain = 1.0 + ends / steps
    points, chances = _outer_rule(density, refine)
    # by decades, so that the yield stays a smooth function of sigma
    rare = _CUT * 10 ** np.floor(np.log10(_least_loss(density, dnl, inl, steps)))
    if resistor_sigma > 0:
        keep = _carry(chances, rare)
        return string_yield(
            density,
            dnl,
            inl,
            resistor_sigma,
            bow[1:-1],
            mean_gain,
            points[keep],
            chances[keep] / chances[keep].sum(),
            refine,
        )
    x, y = (v.ravel() for v in np.meshgrid(points, points, indexing="ij"))
    chance = np.outer(chances, chances).ravel()
    if density.symmetric and not systematic.any():
        # (x, y) and (-y, -x) are one array, seen from either end
        tilt = np.round((x + y) / density.width, 9)
        chance *= np.where(tilt > 0, 2.0, tilt == 0)
    keep = _carry(chance, rare)
    x, y, chance = x[keep], y[keep], chance[keep] / chance[keep].sum()
    far = density.reach + np.abs(x).max() + np.abs(bow).max()
    gain = mean_gain + (y - x) / steps
    band = make_band(min(inl, far), dnl, density, (0.0,), 2.0 * (1 + 0.25 * refine))
    fixed = bow[1:-1, np.newaxis]

    def chain(length: int) -> NDArray:
        tilt = np.arange(1, length) / length
        shift = x + np.outer(tilt, y - x) - resample(fixed, length)
        stretch = Stretch(shift, gain, still_path(length - 1), tied=True)
        loss, survive = stepped_chain(band, density, stretch)
        return hazard(loss[:, 0], survive[:, 0])

    if may_squeeze(fixed, density.width):
        hazards = extrapolate(chain, steps, grows=True)
    else:
        hazards = chain(steps)
    return float(chance @ -np.expm1(-hazards)), float(chance @ np.exp(-hazards))


def _outer_rule(density: OffsetDensity, refine: int) -> tuple[Array, Array]:
    """Points and weights of one outer offset, over all its reach.

    For a normal density the trapezoidal sum, which converges exponentially; for others Gauss rules between kinks.
    """
    spacing = _SPACING / (1 + 0.3 * refine)
    if isinstance(density, NormalOffsets):
        count = int(np.ceil(density.reach / density.width / spacing))
        points = np.arange(0.5 - count, count) * spacing * density.width
        chances = density.pdf(points)
    else:
        panels = make_panels(density.reach, density.kinks, density.width, 0.8 / spacing)
        points, chances = panels.nodes, panels.weights * density.pdf(panels.nodes)
    return points.astype(np.float64), np.asarray(chances / chances.sum())


def _least_loss(density: OffsetDensity, dnl: float, inl: float, steps: int) -> float:
    """The loss against the ideal line, which an end-point line only adds to."""
    band = make_band(min(inl, density.reach), dnl, density)
    return max(homogeneous_chain(band, density, steps)[0], 1e-11)


def _carry(chances: Array, part: float) -> NDArray[np.bool_]:
    """Which of the chances to keep, so that the rest sums to less than `part`."""
    order = np.argsort(chances)
    keep = np.ones(len(chances), dtype=bool)
    keep[order[np.cumsum(chances[order]) < part]] = False
    return keep
