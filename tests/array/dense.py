"""The array simulated without any window: every comparator at every sample, one sample after the other."""

import numpy as np

from flashplan.array.window import Comparators, Signal


def convert_densely(
    signal: Signal, comparators: Comparators, generator: np.random.Generator
) -> np.ndarray:
    """Decisions of all comparators, (n, M) bool; each comparator remembers its last decision."""
    count = comparators.thresholds.size
    decisions = np.empty((signal.value.size, count), dtype=bool)
    noise = comparators.noise * generator.standard_normal(decisions.shape)
    last = None
    for n in range(signal.value.size):
        threshold = comparators.thresholds.copy()
        if comparators.sway is not None:
            threshold += (comparators.sway * np.exp(1j * signal.phase[n])).imag
        margin = (
            signal.value[n] + comparators.skew * signal.slope[n] + noise[n] - threshold
        )
        if last is None:
            last = margin > 0
        last = np.where(
            margin >= comparators.hysteresis / 2,
            True,
            np.where(margin <= -comparators.hysteresis / 2, False, last),
        )
        decisions[n] = last
    return decisions
