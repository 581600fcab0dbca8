"""What moves slowly from threshold to threshold, as a Gaussian Markov chain in Hermite modes."""

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigvalsh_tridiagonal

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class GaussianPath:
    """A movement deviation_i z_i of threshold i, each z_i a standard normal that correlates with the one before.

    deviation (count,) in LSB; correlation (count,): of z_i with z_{i-1}, the first with the state before the chain.
    nodes, weights (nodes,): Gauss-Hermite rule of z; hermite (nodes, modes): orthonormal polynomials at the nodes.
    """

    deviation: Array
    correlation: Array
    nodes: Array
    weights: Array
    hermite: Array

    def expectation(self, step: int) -> Array:
        """Matrix P of E[f(z_step) | z_{step-1}] = P f at the nodes.

        Every mode keeps its shape and mode n falls by correlation^n (F. G. Mehler's kernel, 1866).
        """
        fall = self.correlation[step] ** np.arange(self.hermite.shape[1])
        return (self.hermite * fall) @ (self.hermite.T * self.weights)


def still_path(count: int) -> GaussianPath:
    """A path that does not move."""
    one = np.ones(1)
    return GaussianPath(np.zeros(count), np.ones(count), 0 * one, one, one[:, None])


def pinned_path(units: float, sigma: float, taps: Array, modes: int) -> GaussianPath:
    """Return the taps of a string of equal resistors pinned at both ends.

    Tap t moves by sigma^2 t (units - t) / units LSB^2 (a random walk with pinned ends); sigma: relative standard
    deviation of one of the `units` resistors; taps: increasing, between 0 and units. Before the chain nothing is
    known.
    """
    if sigma == 0.0:
        return still_path(len(taps))
    t, rest = taps, units - taps
    correlation = np.sqrt(t[:-1] * rest[1:] / (t[1:] * rest[:-1]))
    return GaussianPath(
        sigma * np.sqrt(t * rest / units),
        np.concatenate([[0.0], correlation]),
        *hermite_rule(modes),
    )


def loose_path(
    units: float, sigma: float, start: float, taps: Array, modes: int
) -> GaussianPath:
    """Return a pinned string (see pinned_path) whose lower end also moves, by a normal of deviation `start`, in LSB.

    The state before the chain is the lower end in units of `start`; the tilt adds start (1 - t / units) to tap t.
    """
    t = np.concatenate([[0.0], taps])
    rest = 1.0 - t / units
    deviation = np.sqrt((start * rest) ** 2 + sigma**2 * t * rest)
    # covariance of neighbours: the later one is the earlier one shrunk towards the far end, plus fresh movement
    correlation = deviation[:-1] * rest[1:] / (rest[:-1] * deviation[1:])
    return GaussianPath(deviation[1:], correlation, *hermite_rule(modes))


def levelled_path(units: float, sigma: float, taps: Array, modes: int) -> GaussianPath:
    """Return all taps of a pinned string less the least-squares line through them, as the nearest Markov chain.

    Deviations and correlations of neighbours are those of the levelled taps; what taps far apart have in common is
    only nearly so. Arguments as pinned_path's, taps all of 1 .. units - 1.
    """
    if sigma == 0.0:
        return still_path(len(taps))
    vectors = line_vectors(len(taps))
    moved = string_covariance_times(vectors, sigma)
    inner = vectors.T @ moved

    def covariance(i: slice, j: slice) -> Array:
        plain = sigma**2 * taps[i] * (units - taps[j]) / units
        crossed = (vectors[i] * moved[j] + moved[i] * vectors[j]).sum(axis=1)
        return plain - crossed + ((vectors[i] @ inner) * vectors[j]).sum(axis=1)

    deviation = np.sqrt(covariance(slice(None), slice(None)))
    neighbours = covariance(slice(-1), slice(1, None))
    correlation = neighbours / (deviation[:-1] * deviation[1:])
    return GaussianPath(
        deviation, np.concatenate([[0.0], correlation]), *hermite_rule(modes)
    )


def line_vectors(count: int) -> Array:
    """Orthonormal vectors of a constant and a slope over `count` thresholds: (count, 2)."""
    slope = np.arange(count) - (count - 1) / 2
    return np.stack([np.full(count, count**-0.5), slope / np.linalg.norm(slope)], 1)


def string_covariance_times(vectors: Array, sigma: float) -> Array:
    """Covariance of all inner taps of a pinned string, times vectors (units - 1, columns), in linear time.

    Entry (j, k), j <= k, is sigma^2 j (units - k) / units.
    """
    units = len(vectors) + 1
    tap = np.arange(1.0, units)[:, np.newaxis]
    up_to = np.cumsum(tap * vectors, axis=0)
    beyond = np.cumsum(((units - tap) * vectors)[::-1], axis=0)[::-1]
    own = (units - tap) * vectors
    return sigma**2 / units * ((units - tap) * up_to + tap * (beyond - own))


def modes_needed(ratio: float) -> int:
    """Hermite modes that resolve a density whose width is 1 / ratio of the path's largest deviation.

    The nodes lie pi / sqrt(modes) standard deviations apart, here 0.6 of the width.
    """
    return int(np.ceil(10 + 27 * ratio**2))


@cache
def hermite_rule(modes: int) -> tuple[Array, Array, Array]:
    """Gauss-Hermite nodes and weights of a standard normal, and the orthonormal polynomials at the nodes.

    Nodes beyond 8 standard deviations carry no weight worth counting and are left out.
    """
    all_nodes = eigvalsh_tridiagonal(np.zeros(modes), np.sqrt(np.arange(1.0, modes)))
    nodes = np.asarray(all_nodes, dtype=np.float64)
    nodes = nodes[np.abs(nodes) < 8.0]
    hermite = np.ones((len(nodes), modes))
    below = np.zeros(len(nodes))
    for n in range(modes - 1):
        above = (nodes * hermite[:, n] - np.sqrt(n) * below) / np.sqrt(n + 1.0)
        below, hermite[:, n + 1] = hermite[:, n], above
    return nodes, np.asarray(1.0 / (hermite**2).sum(axis=1)), hermite
