"""What the decisions near the thresholds say of each comparator: a probit likelihood, expanded about a guess."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import erfcx

Floats = NDArray[np.float64]

# Decisions looked at: enough for intervals far narrower than any budget line, few enough to be done in a second.
_MOST_ROWS = 400_000
_FEWEST_ROWS = 8  # near a threshold, without which it says nothing


@dataclass(frozen=True)
class NearDecisions:
    """The decisions that were taken near a threshold, sorted by comparator; one row each.

    position: (K,) first guess of the thresholds that were reached, in LSB; index: (K,) their number, from 0; start:
    (K,) their first row. value: the input in LSB; slope: of the input against its largest; last: +-1, this
    comparator's decision a sample earlier; sign: +-1, its decision. spacing: of neighbouring samples of the input in
    LSB, below which no scatter can be seen. doubt: distance from a threshold within which decisions disagree with it.
    """

    position: Floats
    index: NDArray[np.int64]
    start: NDArray[np.int64]
    owner: NDArray[np.int64]
    value: Floats
    slope: Floats
    last: Floats
    sign: Floats
    spacing: float
    doubt: float


@dataclass(frozen=True)
class Expansion:
    """Log-likelihood near a guess, per comparator, to second order.

    score: (K, 4) and information: (K, 4, 4) for threshold, memory, lead (LSB) and the logarithm of the scatter.
    steepness: (K,) mean square slope, against the largest, of the rows that tell of the scatter.
    """

    score: Floats
    information: Floats
    steepness: Floats


def balance(value: Floats, zeros: NDArray[np.int64]) -> Floats:
    """Value below which as many samples lie as were decided 0, for each comparator: (M,), in the unit of `value`.

    That is the histogram test's code transition level, for any input whose value at each sample (n,) is known; nan for
    a comparator that always decided the same. zeros: (M,) how often each decided 0.
    Source: IEEE Std 1241-2010, histogram test (memory).

    >>> balance(np.array([3.0, 1.0, 2.0]), np.array([1, 3]))
    array([1.5, nan])
    """
    ordered = np.sort(value)
    inner = np.clip(zeros, 1, value.size - 1)
    level = 0.5 * (ordered[inner - 1] + ordered[inner])
    return np.where(inner == zeros, level, np.nan)


def near_decisions(
    value: Floats, slope: Floats, decisions: NDArray[np.bool_]
) -> NearDecisions:
    """Gather the decisions that were taken where they were in doubt.

    value: (n,) input in LSB; slope: (n,) its slope, any unit; decisions: (n, M) bool, in the order taken. Long records
    are cut short once they say enough.
    """
    zeros = value.size - np.count_nonzero(decisions, axis=0)
    level = balance(value, zeros)
    reached = np.flatnonzero(np.isfinite(level))
    order = np.argsort(value, kind="stable")
    # Samples that repeat the same phase of the input come no closer than those of one period.
    apart = np.count_nonzero(np.diff(value[order]) > 1e-9 * np.ptp(value)) + 1
    spacing = float(np.pi * np.ptp(value) / 2 / apart)
    # One comparator's decisions side by side: hundreds of strided walks through the record would take far longer.
    decided = np.ascontiguousarray(decisions.T)
    doubt = _doubt(value, decided, level, reached) + 10 * spacing
    samples = int(min(value.size, max(1024, _MOST_ROWS / (2 * doubt + 1))))
    order = order[order < samples]
    ordered = value[order]
    low, high = np.searchsorted(ordered, level[reached] + [[-doubt], [doubt]])
    told = high - low >= _FEWEST_ROWS
    reached, low, high = reached[told], low[told], high[told]
    rows = [
        order[a:b][order[a:b] > 0] for a, b in zip(low, high, strict=True)
    ]  # the first sample has no last decision
    counts = np.array([row.size for row in rows], dtype=np.int64)
    row = np.concatenate(rows) if rows else np.zeros(0, dtype=np.int64)
    owner = np.repeat(np.arange(reached.size), counts)
    column = reached[owner]
    return NearDecisions(
        position=level[reached],
        index=reached,
        start=np.concatenate([[0], np.cumsum(counts)[:-1]]).astype(np.int64),
        owner=owner,
        value=value[row],
        slope=slope[row] / np.abs(slope).max(),
        last=2.0 * decided[column, row - 1] - 1.0,
        sign=2.0 * decided[column, row] - 1.0,
        spacing=spacing,
        doubt=doubt,
    )


def _doubt(
    value: Floats,
    decided: NDArray[np.bool_],
    level: Floats,
    reached: NDArray[np.int64],
) -> float:
    """Distance from a threshold beyond which a decision that disagrees with it is a rare accident."""
    far = [np.zeros(1)]
    for k in reached:
        wrong = decided[k] != (value > level[k])
        far.append(np.abs(value[wrong] - level[k]))
    # Nothing is lost beyond, and the choice of rows does not look at their decisions: it favours none.
    return 1.6 * float(np.quantile(np.concatenate(far), 0.99))


def expand(near: NearDecisions, guess: Floats, scatter: Floats) -> Expansion:
    """Expand the log-likelihood of P(1) = Phi((v - T + m last + l slope) / s) about a guess.

    guess: (K, 3) threshold T, memory m (half the hysteresis) and lead l (skew times the largest slope), in LSB;
    scatter: s of each row, in LSB.
    Source: C. I. Bliss, "The method of probits", Science 79, 1934 (memory).
    """
    own = guess[near.owner]
    eta = (
        near.value - own[:, 0] + own[:, 1] * near.last + own[:, 2] * near.slope
    ) / scatter
    # Mills' ratio of the decision taken; erfcx keeps it exact far out in the tail.
    mills = np.sqrt(2 / np.pi) / erfcx(-near.sign * eta / np.sqrt(2))
    pull = near.sign * mills
    weight = mills * (mills + near.sign * eta)
    design = np.stack([-1 / scatter, near.last / scatter, near.slope / scatter, -eta])
    score = np.add.reduceat(design * pull, near.start, axis=1).T
    information = np.empty((near.start.size, 4, 4))
    for i in range(4):
        weighted = design[i] * weight
        for j in range(i + 1):
            information[:, i, j] = np.add.reduceat(weighted * design[j], near.start)
            information[:, j, i] = information[:, i, j]
    told = np.add.reduceat(weight * eta**2, near.start) + 1e-300
    steepness = np.add.reduceat(weight * eta**2 * near.slope**2, near.start) / told
    return Expansion(score, information, steepness)
