"""Spectrum of a coherently sampled sine: SNDR, SFDR, THD and the frequencies at which a record is coherent."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.metrics.ideal import enob_from_sndr

Floats = NDArray[np.float64]

# Harmonics that count as distortion; the rest is noise.
_HARMONICS = 10


def coherent_frequency(
    sample_rate: float, target: float, samples: int
) -> tuple[int, float]:
    """Whole cycles in a record, and the frequency that they stand for, nearest to a target.

    sample_rate, target in Hz; samples: record length. The cycles share no factor with the record's length, so that no
    two samples meet the sine at the same phase. Raises ValueError for a target that is not positive.
    Source: IEEE Std 1241, coherent sampling (memory).

    >>> coherent_frequency(1e9, 100e6, 4096)
    (409, 99853515.625)
    """
    if target <= 0:
        raise ValueError("the target frequency must be positive")
    wanted = target / sample_rate * samples
    below, above = max(1, math.floor(wanted)), max(1, math.ceil(wanted))
    while below > 1 and math.gcd(below, samples) > 1:
        below -= 1
    while math.gcd(above, samples) > 1:
        above += 1
    cycles = below if wanted - below <= above - wanted else above
    return cycles, cycles * sample_rate / samples


def folded_bin(cycles: int, samples: int) -> int:
    """Bin of the one-sided spectrum into which a number of cycles per record falls."""
    rest = cycles % samples
    return min(rest, samples - rest)


@dataclass(frozen=True)
class SineMetrics:
    """Figures of coherently sampled sines, each (records,). Powers in the square of the samples' unit."""

    sndr_db: Floats
    sfdr_db: Floats
    thd_db: Floats
    enob: Floats
    signal_power: Floats
    error_power: Floats


def one_sided_power(records: ArrayLike) -> Floats:
    """Power in each bin of real records (records, samples), without their mean: (records, samples // 2 + 1).

    The bins sum to the variance. Source: Parseval's theorem.
    """
    values = np.atleast_2d(np.asarray(records, dtype=float))
    samples = values.shape[1]
    power = np.abs(np.fft.rfft(values - values.mean(axis=1, keepdims=True))) ** 2 * (
        2.0 / samples**2
    )
    if samples % 2 == 0:
        power[:, -1] /= 2.0
    power[:, 0] = 0.0
    return np.asarray(power)


def sine_metrics(records: ArrayLike, cycles: int) -> SineMetrics:
    """Signal, error and distortion of coherent records (records, samples) with `cycles` of the sine in each.

    The signal is its one bin, which for a coherent record is the least-squares sine; all else but the mean is error.
    Raises ValueError when the signal falls on the mean or on half the sample rate.
    Source: IEEE Std 1241, SINAD by the DFT of a coherent record (memory).
    """
    power = one_sided_power(records)
    samples = np.atleast_2d(np.asarray(records)).shape[1]
    signal_bin = folded_bin(cycles, samples)
    if signal_bin == 0 or 2 * signal_bin == samples:
        raise ValueError("the sine falls on the mean or on half the sample rate")
    signal = power[:, signal_bin]
    rest = power.copy()
    rest[:, signal_bin] = 0.0
    error = rest.sum(axis=1)
    harmonic = {
        folded_bin(order * cycles, samples) for order in range(2, _HARMONICS + 1)
    } - {0, signal_bin}
    with np.errstate(divide="ignore"):  # a record without any error has no finite ratio
        sndr = 10 * np.log10(signal / error)
        return SineMetrics(
            sndr_db=sndr,
            sfdr_db=10 * np.log10(signal / rest.max(axis=1)),
            thd_db=10 * np.log10(rest[:, sorted(harmonic)].sum(axis=1) / signal),
            enob=enob_from_sndr(sndr),
            signal_power=signal,
            error_power=error,
        )
