"""Long chains at the price of short ones: the repeated operator's leading eigenvalue takes over."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from flashplan.metrics.gaussian_path import still_path
from flashplan.metrics.offset_density import OffsetDensity
from flashplan.metrics.threshold_chain import Band, Hazard, Stretch, stepped_chain

Array = NDArray[np.float64]

# Lengths of the short chains, and the length up to which a chain is stepped as it is.
SHORT = (10, 14, 20, 28, 40)
LONGEST = 126


def hazard(loss: NDArray, survive: NDArray) -> NDArray:
    """-log(survival), from whichever of loss and survival keeps its relative accuracy."""
    small = loss.real < 0.5
    rest = np.where(small | (survive.real < 1e-300), 1e-300, survive)
    return np.where(small, -np.log1p(-np.where(small, loss, 0.0)), -np.log(rest))


def extrapolate(solve: Callable[[int], NDArray], length: int, grows: bool) -> NDArray:
    """Return solve(length) from chains of the lengths SHORT.

    solve(n): hazards of the chain squeezed to n steps. grows: whether they grow with n (each step is one threshold)
    or tend to a limit (each step stands for length / n thresholds). Where the weights change slowly from step to
    step, the hazard per unit is a series in 1/n, of which SHORT gives the first terms.
    """
    n = np.array(SHORT, dtype=float)
    values = np.array([solve(short) for short in SHORT])
    if grows:
        values = values / n[(...,) + (np.newaxis,) * (values.ndim - 1)]
    at, knots = 1.0 / length, 1.0 / n  # Lagrange polynomials in 1/n
    shares = [np.prod([(at - o) / (k - o) for o in knots if o != k]) for k in knots]
    result = np.tensordot(shares, values, axes=1)
    return result * length if grows else result


def resample(values: NDArray, length: int) -> NDArray:
    """Values at the inner taps of a string, (taps, columns), seen at the inner taps of one of `length` units."""
    units = len(values) + 1
    if length == units:
        return values
    where = np.arange(1, units) / units
    return CubicSpline(where, values)(np.arange(1, length) / length)


def may_squeeze(values: NDArray, width: float) -> bool:
    """Whether a chain moved by `values` (taps, columns) is long, and smooth enough to be seen at SHORT's taps alone.

    Smooth: a spline through the taps of the longest of SHORT misses no value by a thousandth of the density's width.
    """
    if len(values) + 1 <= LONGEST:
        return False
    coarse = resample(values, SHORT[-1])
    spline = CubicSpline(np.arange(1, SHORT[-1]) / SHORT[-1], coarse)
    miss = spline(np.arange(1, len(values) + 1) / (len(values) + 1)) - values
    return bool(np.abs(miss).max() < 1e-3 * width)


def hazard_per_threshold(
    band: Band, density: OffsetDensity, gains: Array, reach: float
) -> Hazard:
    """Return -log of the band operator's leading eigenvalue: the hazard of one more threshold among equal ones.

    gains: the gains that it will be asked for; reach: the farthest movement, in LSB. The result takes movements
    (columns, modes), real or nearly so, and gains (columns, 1).
    """
    gains = np.unique(gains)
    count = max(9, int(np.ceil(8 * reach / density.width)))
    knots = np.linspace(-reach, reach, count)
    move, gain = (v.ravel() for v in np.meshgrid(knots, gains, indexing="ij"))
    ends = []
    for count in (12, 24):
        still = Stretch(np.tile(move, (count, 1)), gain, still_path(count), tied=False)
        loss, survive = stepped_chain(band, density, still)
        ends.append(hazard(loss[:, 0], survive[:, 0]))
    each = ((ends[1] - ends[0]) / 12).reshape(len(knots), len(gains))
    splines = [CubicSpline(knots, row) for row in np.log(np.maximum(each, 1e-300)).T]

    def per_threshold(moved: NDArray, gain: NDArray) -> NDArray:
        result = np.empty_like(moved)
        for one, spline in zip(gains, splines, strict=True):
            rows = gain[:, 0] == one
            at = np.clip(moved[rows].real, -reach, reach)
            value = spline(at)
            if np.iscomplexobj(moved):  # a short way off the real axis: Taylor
                aside = 1j * moved[rows].imag
                value = value + aside * (
                    spline(at, 1)
                    + aside / 2 * (spline(at, 2) + aside / 3 * spline(at, 3))
                )
            result[rows] = np.exp(value)
        return result

    return per_threshold
