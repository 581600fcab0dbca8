"""Histogram test: thresholds from how often each code comes under a ramp or a sine, and how many samples it takes."""

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.stats import norm


def code_counts(codes: ArrayLike, bits: int) -> NDArray[np.int64]:
    """Count each code: (2**bits,). codes: whole numbers from 0 to 2**bits - 1, of any shape.

    Raises ValueError that names the first sample that is no such number.

    >>> code_counts([0, 1, 1, 3], 2)
    array([1, 2, 0, 1])
    """
    samples = np.asarray(codes).ravel()
    wrong = (samples < 0) | (samples >= 2**bits) | (samples != np.floor(samples))
    if np.any(wrong):
        first = int(np.argmax(wrong))
        raise ValueError(
            f"sample {first} is {samples[first]}; codes are whole numbers from 0 to {2**bits - 1}"
        )
    return np.bincount(samples.astype(np.int64), minlength=2**bits)


def ramp_thresholds(
    counts: ArrayLike, start: float, stop: float
) -> NDArray[np.float64]:
    """Return the thresholds (..., M), in V, under a ramp that went evenly from start to stop, in V.

    T_k = start + (stop - start) (samples below code k) / (all samples); counts: (..., M + 1).
    Raises ValueError when the ramp did not reach beyond the outer thresholds, which then are not known.
    Source: IEEE Std 1241-2010, ramp histogram (memory).

    >>> ramp_thresholds([2, 1, 1], 0.0, 4.0)
    array([2., 3.])
    """
    return start + (stop - start) * _shares_below(counts)


def sine_thresholds(
    counts: ArrayLike, amplitude: float, offset: float
) -> NDArray[np.float64]:
    """Return the thresholds (..., M), in V, under a sine of this amplitude about offset, in V.

    T_k = offset - amplitude cos(pi (samples below code k) / (all samples)); counts: (..., M + 1). The samples must be
    spread evenly over the sine's phases: coherent, or many and random.
    Raises ValueError when the sine did not reach beyond the outer thresholds.
    Source: J. Doernberg, H.-S. Lee, D. A. Hodges, "Full-speed testing of A/D converters", IEEE J. Solid-State Circuits
    19(6), 1984; IEEE Std 1241-2010, sine histogram (memory).

    >>> print(np.round(sine_thresholds([1, 1, 1], 1.0, 0.0), 3))
    [-0.5  0.5]
    """
    return offset - amplitude * np.cos(np.pi * _shares_below(counts))


def missing_codes(counts: ArrayLike) -> NDArray[np.int64]:
    """Return the codes of one histogram (M + 1,) that never came.

    >>> missing_codes([5, 4, 0, 6])
    array([2])
    """
    return np.flatnonzero(np.asarray(counts) == 0)


def sine_histogram_samples(bits: int, tolerance_lsb: float, confidence: float) -> int:
    """Samples of a sine that measure the DNL of a middle code, where a sine spends least, to a tolerance.

    pi 2**(bits - 1) Z**2 / tolerance**2, with Z the two-sided normal quantile of the confidence, for samples at random
    phases; coherent ones need fewer. Raises ValueError for a tolerance or confidence out of range.
    Source: J. Doernberg, H.-S. Lee, D. A. Hodges, IEEE J. Solid-State Circuits 19(6), 1984 (memory).

    >>> sine_histogram_samples(8, 0.1, 0.99)
    266806
    """
    quantile = _two_sided_quantile(tolerance_lsb, confidence)
    return math.ceil(math.pi * 2 ** (bits - 1) * (quantile / tolerance_lsb) ** 2)


def ramp_histogram_samples(bits: int, tolerance_lsb: float, confidence: float) -> int:
    """Samples at random moments of a ramp over the whole range that measure each code's DNL to a tolerance.

    2**bits Z**2 / tolerance**2, since Z**2 / tolerance**2 hits pin a code's width to that relative tolerance; evenly
    spaced ones need fewer. Raises ValueError for a tolerance or confidence out of range.
    Source: counting statistics, closed form.

    >>> ramp_histogram_samples(8, 0.1, 0.99)
    169854
    """
    quantile = _two_sided_quantile(tolerance_lsb, confidence)
    return math.ceil(2**bits * (quantile / tolerance_lsb) ** 2)


def _two_sided_quantile(tolerance_lsb: float, confidence: float) -> float:
    if not (tolerance_lsb > 0 and 0 < confidence < 1):
        raise ValueError(
            "the tolerance must be above zero and the confidence between zero and one, "
            f"found {tolerance_lsb!r} and {confidence!r}"
        )
    return float(norm.ppf((1.0 + confidence) / 2.0))


def _shares_below(counts: ArrayLike) -> NDArray[np.float64]:
    """Share of the samples below each code but the lowest: (..., M)."""
    hits = np.asarray(counts, dtype=np.float64)
    if hits.ndim == 0 or hits.shape[-1] < 2 or np.any(hits < 0):
        raise ValueError("counts of two codes or more are needed, none below zero")
    if np.any(hits[..., [0, -1]] == 0):
        raise ValueError(
            "the lowest or the highest code never came: the signal must reach beyond the outer thresholds"
        )
    below = np.cumsum(hits, axis=-1)
    return below[..., :-1] / below[..., -1:]
