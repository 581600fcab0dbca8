"""What a pinned string less its least-squares line has in common over long distances, and a Markov chain has not."""

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri
from scipy.stats import qmc

from flashplan.metrics.gaussian_path import GaussianPath, levelled_path, line_vectors
from flashplan.metrics.long_chain import hazard_per_threshold, resample
from flashplan.metrics.offset_density import OffsetDensity
from flashplan.metrics.threshold_chain import make_band

Array = NDArray[np.float64]

# Taps and points of the average; points a power of two.
_TAPS = 48
_POINTS = 2**13


def long_range_loss(
    density: OffsetDensity,
    dnl: float,
    inl: float,
    resistor_sigma: float,
    left: Array,
    gain: float,
) -> float:
    """Return what the loss with the levelled string is above the loss with its Markov chain (see levelled_path).

    Both losses are averages of 1 - exp(-sum of the hazards along the string), over string movements of either
    covariance, on one Sobol sequence of the covariances' principal components. What the sum leaves out (how
    neighbouring thresholds go together) is nearly alike in both and falls out of the difference. left: systematic
    errors less their line, in LSB (2**bits - 1,); gain: the fitted LSB. Absolute error a few 1e-4.
    """
    units = len(left) + 1
    length = min(units, _TAPS)
    each = resistor_sigma * np.sqrt(units / length)
    path = levelled_path(length, each, np.arange(1.0, length), 2)
    reach = 7 * path.deviation.max() + np.abs(left).max()
    half = min(inl, (density.reach + reach) / gain)
    band = make_band(half, dnl, density, (), 2.0)
    per_threshold = hazard_per_threshold(band, density, np.array([gain]), reach)
    fixed = resample(left[:, np.newaxis], length)[:, 0]
    sequence = qmc.Sobol(length - 1, scramble=False).random(_POINTS)
    normals = ndtri(sequence + 0.5 / _POINTS)

    def loss(covariance: Array) -> float:
        values, vectors = np.linalg.eigh(covariance)
        components = (vectors * np.sqrt(np.maximum(values, 0.0)))[:, ::-1]
        moved = normals @ components.T + fixed
        rate = per_threshold(moved, np.full((_POINTS, 1), gain)).sum(axis=1)
        return float(-np.expm1(-rate * units / length).mean())

    return loss(_levelled_covariance(length, each)) - loss(_markov_covariance(path))


def _levelled_covariance(units: int, sigma: float) -> Array:
    tap = np.arange(1, units)
    string = np.minimum.outer(tap, tap) * (units - np.maximum.outer(tap, tap)) / units
    line = line_vectors(units - 1)
    level = np.eye(units - 1) - line @ line.T
    return sigma**2 * level @ string @ level


def _markov_covariance(path: GaussianPath) -> Array:
    """Of a chain: correlations multiply along the way."""
    steps = path.correlation[1:]
    along = np.concatenate([[0.0], np.cumsum(np.log(np.abs(steps)))])
    sign = np.concatenate([[1.0], np.cumprod(np.sign(steps))])
    correlation = np.exp(-np.abs(np.subtract.outer(along, along)))
    return correlation * np.outer(sign * path.deviation, sign * path.deviation)
