"""Conversion of a signal by all comparators at once, worked out only near the input, where any can be uncertain."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

# Noise beyond this many sigma is cut off by the window: one decision in 1e10.
_NOISE_REACH = 6.5


@dataclass(frozen=True)
class Comparators:
    """One array's comparators, in LSB unless said: all (2**bits - 1,) or one number for all.

    thresholds: with every fixed error in them. skew: sampling instant against the mean, in s. hysteresis: full width.
    undecided: distance from the threshold within which a decision is left to chance.
    sway: what the input moves each threshold by, as a complex phasor against the input's own sine.
    """

    thresholds: Floats
    skew: Floats
    noise: float
    hysteresis: float
    undecided: float
    sway: NDArray[np.complex128] | None = None


@dataclass(frozen=True)
class Signal:
    """The input at each sample, all (n,): value in LSB, slope in LSB/s, phase in rad for the thresholds' sway."""

    value: Floats
    slope: Floats
    phase: Floats


@dataclass(frozen=True)
class Decisions:
    """Decisions of the comparators near the input, and what is certain beyond.

    first: (n,) index k of the threshold in column 0, from 1; may lie outside 1 .. count.
    near: (n, width) bool. Thresholds below column 0 are passed, those above the last column are not.
    """

    first: NDArray[np.int64]
    near: NDArray[np.bool_]
    count: int

    def ones(self) -> NDArray[np.int64]:
        """Number of thresholds passed at each sample, (n,)."""
        return np.clip(self.first - 1, 0, self.count) + np.count_nonzero(
            self.near & self._real(), axis=1
        )

    def bubbly(self) -> NDArray[np.int64]:
        """Samples whose thermometer word has a bubble: some threshold passed above one that is not."""
        return np.flatnonzero((self.near[:, 1:] & ~self.near[:, :-1]).any(axis=1))

    def words(self, samples: NDArray[np.int64]) -> NDArray[np.bool_]:
        """Whole thermometer words of some samples, (len(samples), count), lowest threshold first."""
        threshold = np.arange(1, self.count + 1)
        column = threshold - self.first[samples, None]
        width = self.near.shape[1]
        inside = np.take_along_axis(
            self.near[samples], np.clip(column, 0, width - 1), axis=1
        )
        return np.where(column < 0, True, np.where(column >= width, False, inside))

    def _real(self) -> NDArray[np.bool_]:
        threshold = self.first[:, None] + np.arange(self.near.shape[1])
        return (threshold >= 1) & (threshold <= self.count)


def reach(comparators: Comparators, signal: Signal) -> int:
    """Thresholds on each side of the input that may be uncertain at some sample."""
    count = comparators.thresholds.size
    fixed = np.abs(comparators.thresholds - np.arange(1, count + 1)).max()
    timing = np.abs(comparators.skew).max() * np.abs(signal.slope).max()
    sway = 0.0 if comparators.sway is None else np.abs(comparators.sway).max()
    spread = (
        fixed
        + timing
        + sway
        + _NOISE_REACH * comparators.noise
        + comparators.hysteresis / 2
        + comparators.undecided
    )
    return int(min(np.ceil(spread) + 1, count + 1))


def convert(
    signal: Signal,
    comparators: Comparators,
    generator: np.random.Generator,
    half: int,
    before: Decisions | None = None,
) -> Decisions:
    """Decide every sample. The cost is samples times 2 half, whatever the number of comparators.

    half: from `reach` over the whole signal; before: decisions of the samples before these, which hysteresis remembers.
    """
    count = comparators.thresholds.size
    base = np.clip(np.floor(signal.value), -half, count + half).astype(np.int64)
    first = base + 1 - half
    threshold = first[:, None] + np.arange(2 * half)
    margin = generator.standard_normal(threshold.shape)
    margin *= comparators.noise
    # Beyond the array's ends there is nothing to decide: those below are passed, those above never.
    at = np.clip(threshold - 1, 0, count - 1)
    margin += signal.value[:, None] - comparators.thresholds[at]
    margin += comparators.skew[at] * signal.slope[:, None]
    if comparators.sway is not None:
        turn = np.exp(1j * signal.phase)[:, None]
        margin -= (comparators.sway[at] * turn).imag
    margin[threshold < 1] = np.inf
    margin[threshold > count] = -np.inf
    near = _with_hysteresis(margin, first, comparators.hysteresis, before)
    if comparators.undecided > 0:
        lost = np.abs(margin) < comparators.undecided
        near[lost] = generator.random(int(np.count_nonzero(lost))) < 0.5
    return Decisions(first, near, count)


def _with_hysteresis(
    margin: Floats, first: NDArray[np.int64], width: float, before: Decisions | None
) -> NDArray[np.bool_]:
    """Each comparator keeps its own last decision while the input is within half the width of its threshold."""
    near = margin > 0
    if width == 0:
        return near
    held = np.abs(margin) < width / 2
    near &= ~held
    row, column = np.nonzero(held)
    start = row == 0
    near[0, column[start]] = _first_held(
        margin[0, column[start]], first[0] + column[start], before
    )
    held[0] = False
    row, column = row[~start], column[~start]
    columns = margin.shape[1]
    while row.size:
        place = column + first[row] - first[row - 1]
        inside = (place >= 0) & (place < columns)
        last = row - 1, np.clip(place, 0, columns - 1)
        known = ~inside | ~held[last]
        decision = np.where(inside, near[last], place < 0)
        settled_row, settled_column = row[known], column[known]
        near[settled_row, settled_column] = decision[known]
        held[settled_row, settled_column] = False
        row, column = row[~known], column[~known]
    return near


def _first_held(
    margin: Floats, threshold: NDArray[np.int64], before: Decisions | None
) -> NDArray[np.bool_]:
    """What sample 0 holds: the last decision before it, or the sign of its margin where there is none."""
    if before is None:
        return margin > 0
    column = threshold - before.first[-1]
    width = before.near.shape[1]
    inside = before.near[-1, np.clip(column, 0, width - 1)]
    return np.where(column < 0, True, np.where(column >= width, False, inside))
