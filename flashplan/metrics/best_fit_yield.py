"""Yield when DNL and INL are taken from the least-squares line through all thresholds.

What the line leaves of independent normal offsets is normal with covariance sigma^2 (1 - H), H the projection on a
constant and a slope. The chain can only do sigma^2 I; taking sigma^2 H away from a covariance is a deconvolution, and a
Gaussian is deconvolved by an average over imaginary movements:

    P(residuals in box) = E P(offsets + i sigma (z_0 v_0 + z_1 v_1) in box),   z_0, z_1 standard normal,

v_0 and v_1 the unit vectors of constant and slope. The average is a small Gauss-Hermite sum.
"""

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from flashplan.metrics.fixed_line_yield import shifted_hazards
from flashplan.metrics.gaussian_path import (
    hermite_rule,
    levelled_path,
    line_vectors,
    string_covariance_times,
)
from flashplan.metrics.levelled_string import long_range_loss
from flashplan.metrics.offset_density import NormalOffsets, OffsetDensity

Array = NDArray[np.float64]


def best_fit_yield(
    bits: int,
    density: OffsetDensity,
    dnl: float,
    inl: float,
    resistor_sigma: float,
    systematic: Array,
    refine: int = 0,
) -> tuple[float, float]:
    """Return loss and yield; arguments as linearity_yield's. Raises ValueError for offsets that are not normal.

    The fitted LSB is averaged over with three points where its scatter matters. Resistor mismatch, less its own line, enters as the Markov
    chain with the same deviation of each threshold and the same correlation of neighbours.
    """
    if not isinstance(density, NormalOffsets):
        raise ValueError(  # noqa: TRY004 (a wrong choice, not a wrong type)
            "the yield with the best-fit line needs normal offsets"
        )
    vectors = line_vectors(2**bits - 1)
    moved = string_covariance_times(vectors, resistor_sigma)
    slope = vectors[:, 1]
    per_tilt = slope[-1] - slope[-2]  # a tilt of the line, from a movement along v_1
    tilt = per_tilt * (slope @ systematic)
    wobble = per_tilt * np.sqrt(density.sigma**2 + slope @ moved[:, 1])
    left = systematic - vectors @ (vectors.T @ systematic)
    gains, shares = np.full(1, 1.0 + tilt), np.ones(1)
    if (wobble * (min(dnl, inl) / density.sigma) ** 2) ** 2 > 1e-4:
        gains = gains + wobble * np.sqrt(3.0) * np.array([-1.0, 0.0, 1.0])
        shares = np.array([1.0, 4.0, 1.0]) / 6.0
    if bits == 2:
        return _two_bits(density.sigma, resistor_sigma, dnl, inl, left, gains, shares)
    nodes, chances = _movements(
        vectors, density, min(dnl, inl), not systematic.any(), refine
    )
    shift = -left[:, np.newaxis] + 1j * density.sigma * (vectors @ nodes)
    hazards = shifted_hazards(
        density,
        dnl,
        inl,
        resistor_sigma,
        np.repeat(shift, len(gains), axis=1),
        np.tile(gains, len(chances)),
        refine,
        levelled_path,
    )
    weights = np.outer(chances, shares).ravel()
    loss = float((weights @ -np.expm1(-hazards)).real)
    survive = float((weights @ np.exp(-hazards)).real)
    if resistor_sigma > 0:
        more = long_range_loss(density, dnl, inl, resistor_sigma, left, 1.0 + tilt)
        loss, survive = loss + more, survive - more
    return loss, survive


def _movements(
    vectors: Array, density: NormalOffsets, goal: float, symmetric: bool, refine: int
) -> tuple[Array, Array]:
    """Gauss-Hermite rule for (z_0, z_1): nodes (2, columns), weights (columns,), folded by symmetry.

    Reversing the array changes the sign of z_1, changing the sign of all errors that of both, and the yield at -z is
    the complex conjugate.
    """
    strength = min(goal / density.sigma, 7.0) * np.abs(vectors).max(axis=0)
    rules = [
        hermite_rule(int(np.ceil(2 + 4 * s + s**2)) + 2 * refine) for s in strength
    ]
    z0, z1 = (v.ravel() for v in np.meshgrid(rules[0][0], rules[1][0], indexing="ij"))
    weight = np.outer(rules[0][1], rules[1][1]).ravel()
    z0, z1 = np.round(z0, 12), np.round(z1, 12)
    weight = weight * np.where(z0 > 0, 2.0, z0 == 0)
    if symmetric:
        weight = weight * np.where(z1 > 0, 2.0, z1 == 0)
    else:
        on_axis = (z0 == 0) & (z1 != 0)
        weight = weight * np.where(on_axis & (z1 > 0), 2.0, np.where(on_axis, 0.0, 1.0))
    keep = weight > 1e-11
    return np.array([z0[keep], z1[keep]]), weight[keep] / weight[keep].sum()


def _two_bits(
    sigma: float,
    resistor_sigma: float,
    dnl: float,
    inl: float,
    left: Array,
    gains: Array,
    shares: Array,
) -> tuple[float, float]:
    """Three thresholds leave one residual, r (1, -2, 1) / sqrt(6)."""
    shape = np.array([1.0, -2.0, 1.0]) / np.sqrt(6.0)
    moved = string_covariance_times(shape[:, np.newaxis], resistor_sigma)[:, 0]
    deviation = np.sqrt(sigma**2 + shape @ moved)
    limit = gains * min(inl * np.sqrt(6.0) / 2, dnl * np.sqrt(6.0) / 3)
    mean = shape @ left
    low, high = ndtr((-limit - mean) / deviation), ndtr((mean - limit) / deviation)
    loss = float(shares @ (low + high))
    return loss, 1.0 - loss
