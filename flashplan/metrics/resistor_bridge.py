"""The random walk of a pinned resistor string's taps, in Hermite modes of its normalised position."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class Bridge:
    """A string of `units` equal resistors pinned at both ends, each of relative standard deviation `sigma`.

    Tap j moves by b_j of variance sigma^2 j (units - j) / units LSB^2, and z_j = b_j / its standard deviation is a
    Markov chain of standard normals. nodes, weights (n,): Gauss-Hermite rule of z; modes (n, n): orthonormal Hermite
    polynomials at the nodes. A sigma of zero has the single node z = 0.
    Source: a random walk with pinned ends; F. G. Mehler 1866 for its transition in Hermite polynomials.
    """

    units: int
    sigma: float
    nodes: NDArray[np.float64]
    weights: NDArray[np.float64]
    modes: NDArray[np.float64]

    def deviation(self, tap: int) -> float:
        """Standard deviation of tap `tap`, in LSB."""
        return self.sigma * np.sqrt(tap * (self.units - tap) / self.units)

    def expectation(self, tap: int) -> NDArray[np.float64]:
        """Matrix P of E[f(z_{tap+1}) | z_tap] = P f at the nodes: modes keep their shape, mode n falls by rho^n."""
        rho = np.sqrt(tap * (self.units - tap - 1) / ((tap + 1.0) * (self.units - tap)))
        fall = rho ** np.arange(len(self.nodes))
        return (self.modes * fall) @ (self.modes.T * self.weights)


def make_bridge(units: int, sigma: float, count: int) -> Bridge:
    """Return a bridge on `count` Hermite modes; one mode and no movement for sigma = 0."""
    if sigma == 0.0:
        one = np.ones(1)
        return Bridge(units, 0.0, np.zeros(1), one, one[:, np.newaxis])
    nodes, weights = np.polynomial.hermite_e.hermegauss(count)
    modes = np.empty((count, count))
    modes[:, 0] = 1.0
    if count > 1:
        modes[:, 1] = nodes
    for n in range(1, count - 1):
        modes[:, n + 1] = (nodes * modes[:, n] - np.sqrt(n) * modes[:, n - 1]) / (
            np.sqrt(n + 1.0)
        )
    return Bridge(units, sigma, nodes, weights / weights.sum(), modes)


def modes_needed(spread: float, width: float) -> int:
    """Hermite modes that resolve a density of this width when the string moves by `spread`, both in LSB."""
    return int(np.ceil(8 + 14 * spread / width))
