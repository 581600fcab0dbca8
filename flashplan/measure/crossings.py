"""Where each comparator really decides, and how its last decision, the input's slope and noise move that."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr, ndtr

Floats = NDArray[np.float64]

# Samples within so many LSB of a threshold are looked at; wide enough for any array worth diagnosing.
_WINDOW = 3.0
_FEWEST = 40  # samples near a threshold without which it says nothing
_STEPS = 25


@dataclass(frozen=True)
class Crossings:
    """Estimates at each threshold, (M,) in LSB, each with its standard error; nan where the record does not tell.

    position: of the threshold between its two trip points. memory: half the hysteresis, by which a last decision of 1
    lowers it. lead: how far skew moves it under a rising input. noise: sigma of what scatters from sample to sample.
    together: (M,) bool, where last decision and direction always went together, so that memory holds memory - lead.
    """

    position: Floats
    position_error: Floats
    memory: Floats
    memory_error: Floats
    lead: Floats
    lead_error: Floats
    noise: Floats
    noise_error: Floats
    together: NDArray[np.bool_]


def find_crossings(value: Floats, slope: Floats, decisions: NDArray[np.bool_]) -> Crossings:
    """Estimate every threshold from a record with a known input, by probit regression of each comparator's decisions.

    P(1) = Phi((v - T + memory m + lead s) / sigma), with m = +-1 the comparator's last decision and s the input's slope
    against the largest slope near this threshold.
    value: (n,) input in LSB; slope: (n,) its slope, any unit; decisions: (n, M) bool, in the order taken.
    Source: C. I. Bliss, "The method of probits", Science 79, 1934 (memory); standard errors from Fisher's information.
    """
    count = decisions.shape[1]
    order = np.argsort(value, kind="stable")
    ordered = value[order]
    fields = np.full((8, count), np.nan)
    together = np.zeros(count, dtype=bool)
    for k in range(count):
        middle = _balance(ordered, decisions[order, k])
        low, high = np.searchsorted(ordered, [middle - _WINDOW, middle + _WINDOW])
        inside = order[low:high]
        inside = inside[inside > 0]  # the first sample has no last decision
        if inside.size < _FEWEST:
            continue
        last = 2.0 * decisions[inside - 1, k] - 1.0
        steep = slope[inside] / np.abs(slope[inside]).max()
        together[k] = bool(np.mean(last * np.sign(steep) < 0) > 0.98)
        columns = [np.ones(inside.size), value[inside] - middle, last]
        if not together[k]:
            columns.append(steep)
        fit = _probit(np.stack(columns, axis=1), decisions[inside, k])
        if fit is None:
            continue
        fields[: 2 * len(columns), k] = _in_lsb(middle, *fit)
    position, noise, memory, lead = fields[0:2], fields[2:4], fields[4:6], fields[6:8]
    return Crossings(*position, *memory, *lead, *noise, together)


def _in_lsb(middle: float, beta: Floats, covariance: Floats) -> list[float]:
    """Position, noise, memory and lead, each followed by its standard error, from the regression's own scale."""
    sigma = 1.0 / beta[1]
    found = []
    for place, (offset, sign) in enumerate(((middle, -1.0), (0.0, 0.0), (0.0, 1.0), (0.0, 1.0))[: beta.size]):
        if place == 1:
            found += [sigma, float(np.sqrt(covariance[1, 1])) * sigma**2]
            continue
        gradient = np.zeros(beta.size)
        gradient[place], gradient[1] = sigma, -beta[place] * sigma**2
        found += [offset + sign * beta[place] * sigma, float(np.sqrt(gradient @ covariance @ gradient))]
    return found


def _probit(columns: Floats, decided: NDArray[np.bool_]) -> tuple[Floats, Floats] | None:
    """Coefficients and their covariance by Fisher scoring; None where the decisions are separated, as without noise."""
    sign = np.where(decided, 1.0, -1.0)
    beta = np.zeros(columns.shape[1])
    beta[1] = 1.0
    best = -np.inf
    step = np.zeros_like(beta)
    information = np.eye(beta.size)
    for _ in range(_STEPS):
        eta = columns @ beta
        likelihood = float(log_ndtr(sign * eta).sum())
        if likelihood < best - 1e-9 * abs(best):
            step = step / 2
            beta = beta - step
            continue
        best = likelihood
        below = np.clip(ndtr(eta), 1e-12, 1 - 1e-12)
        density = np.exp(-0.5 * eta**2) / np.sqrt(2 * np.pi)
        information = (columns * (density**2 / (below * (1 - below)))[:, None]).T @ columns
        score = columns.T @ (density * (decided - below) / (below * (1 - below)))
        try:
            step = np.linalg.solve(information, score)
        except np.linalg.LinAlgError:
            return None
        beta = beta + step
        if np.abs(step).max() < 1e-8 * max(1.0, np.abs(beta).max()):
            break
    else:
        return None
    if beta[1] <= 0:
        return None
    try:
        return beta, np.linalg.inv(information)
    except np.linalg.LinAlgError:
        return None


def _balance(value: Floats, decided: NDArray[np.bool_]) -> float:
    """The point of sorted values below which as many lie as are not decided 1."""
    zeros = int(np.count_nonzero(~decided))
    if zeros == 0:
        return float(value[0])
    if zeros == value.size:
        return float(value[-1])
    return float(0.5 * (value[zeros - 1] + value[zeros]))
