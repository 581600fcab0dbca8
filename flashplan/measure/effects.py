"""A mixed model of all comparators: what they share, and how far each strays, from what each one's decisions say."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import minimize

from flashplan.measure.interval import Profile, profile_interval

Floats = NDArray[np.float64]

# A shared effect that the record does not tell at all stays within so many LSB of nothing.
_VAGUE = 10.0
# Spreads in LSB: where the search for one starts at least, and within which it stays, as logarithms.
_SEEN = 0.05
_LOG_SPREAD = (-9.0, 5.0)
SHARED = ("offset", "gain", "bow", "memory", "lead")


@dataclass(frozen=True)
class Effects:
    """The mixed model's answer, in LSB.

    shared: (5,) offset, gain over the range, bow, memory and lead, with their covariance (5, 5); offset and skew: the
    spread of thresholds and of leads over comparators, with profile-likelihood intervals.
    """

    shared: Floats
    covariance: Floats
    offset: Profile
    skew: Profile


def shared_design(place: Floats) -> Floats:
    """How the shared effects make each comparator's threshold, memory and lead: (K, 3, 5). place: (K,) from 0 to 1."""
    design = np.zeros((place.size, 3, 5))
    design[:, 0, 0] = 1.0
    design[:, 0, 1] = place - 0.5
    design[:, 0, 2] = 4 * place * (1 - place)
    design[:, 1, 3] = 1.0
    design[:, 2, 4] = 1.0
    return design


@dataclass(frozen=True)
class _Solution:
    likelihood: float
    shared: Floats
    covariance: Floats
    own: Floats
    rank: Floats


def _solve(
    sigma: Floats, design: Floats, linear: Floats, precision: Floats
) -> _Solution:
    """Restricted likelihood and shared effects for given spreads (offset, skew).

    theta_k = X_k beta + (u_k, 0, w_k), u ~ N(0, offset^2), w ~ N(0, skew^2); each comparator's decisions give
    linear_k . theta - theta . precision_k theta / 2. The strays and beta are integrated in closed form.
    Source: D. A. Harville, J. Am. Stat. Assoc. 72, 1977, restricted maximum likelihood (memory).
    """
    stray = precision[:, ::2, ::2]
    inner = np.eye(2) + sigma[:, None] * stray * sigma
    determinant = inner[:, 0, 0] * inner[:, 1, 1] - inner[:, 0, 1] ** 2
    inverse = np.empty_like(inner)
    inverse[:, 0, 0], inverse[:, 1, 1] = inner[:, 1, 1], inner[:, 0, 0]
    inverse[:, 0, 1] = inverse[:, 1, 0] = -inner[:, 0, 1]
    spread = sigma[:, None] * (inverse / determinant[:, None, None]) * sigma
    across = precision[:, :, ::2] @ spread
    marginal = precision - across @ precision[:, ::2, :]
    pulled = linear - (across @ linear[:, ::2, None])[:, :, 0]
    turned = design.transpose(0, 2, 1)
    square = (turned @ marginal @ design).sum(axis=0) + np.eye(5) / _VAGUE**2
    right = (turned @ pulled[:, :, None]).sum(axis=0)[:, 0]
    covariance = np.linalg.inv(square)
    shared = covariance @ right
    pairs = linear[:, ::2]
    likelihood = (
        -0.5 * float(np.log(determinant).sum())
        + 0.5 * float(np.einsum("ki,kij,kj->", pairs, spread, pairs))
        + 0.5 * float(right @ shared)
        - 0.5 * float(np.linalg.slogdet(square)[1])
    )
    own = design @ shared
    rest = pairs - (precision[:, ::2, :] @ own[:, :, None])[:, :, 0]
    own[:, ::2] += (spread @ rest[:, :, None])[:, :, 0]
    rank = np.einsum("kij,kji->k", stray, spread)
    return _Solution(likelihood, shared, covariance, own, rank)


def fit_effects(
    design: Floats, linear: Floats, precision: Floats, start: Floats
) -> tuple[Floats, Floats, Floats]:
    """Spreads (offset, skew) that the restricted likelihood likes best, and each comparator's (K, 3), with its rank."""

    def cost(logarithm: Floats) -> float:
        sigma = np.exp(np.clip(logarithm, *_LOG_SPREAD))
        return -_solve(sigma, design, linear, precision).likelihood

    # The likelihood is flat where a spread is too small to be seen; a simplex that starts wide does not stay there.
    centre = np.log(np.maximum(start, _SEEN))
    simplex = centre + np.array([[0.0, 0.0], [1.0, 0.2], [-0.2, 1.0]])
    found = minimize(
        cost,
        centre,
        method="Nelder-Mead",
        options={"initial_simplex": simplex, "xatol": 0.01, "fatol": 1e-3},
    )
    sigma = np.exp(np.clip(np.asarray(found.x, dtype=float), *_LOG_SPREAD))
    solution = _solve(sigma, design, linear, precision)
    return sigma, solution.own, solution.rank


def judge_effects(
    design: Floats, linear: Floats, precision: Floats, sigma: Floats, drop: float
) -> Effects:
    """The whole answer about the best spreads. drop: of log-likelihood at an interval's ends."""

    def likelihood(spreads: Floats) -> float:
        return _solve(spreads, design, linear, precision).likelihood

    best = _solve(sigma, design, linear, precision)
    offset, skew = (
        profile_interval(likelihood, sigma, which, drop, scale=1.0) for which in (0, 1)
    )
    return Effects(best.shared, best.covariance, offset, skew)
