"""Random arrays: their threshold errors, and which of them meet the linearity goals."""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.metrics.linearity import Fit, dnl_inl, fitted_line

# Doubles worked on at a time, about what a core keeps close, and the fewest arrays side by side.
_BLOCK = 2**17
_WIDTH = 128


class Judgement(NamedTuple):
    """Which arrays passed, (arrays,), and each one's largest |DNL| and |INL| in LSB, (arrays,)."""

    passed: NDArray[np.bool_]
    max_dnl: NDArray[np.float64]
    max_inl: NDArray[np.float64]


def draw_threshold_errors(
    generator: np.random.Generator,
    arrays: int,
    bits: int,
    offset_sigma_lsb: float,
    resistor_sigma: float = 0.0,
    systematic_lsb: ArrayLike | None = None,
) -> NDArray[np.float64]:
    """Draw the threshold errors of random arrays, in LSB: (arrays, 2**bits - 1).

    Independent normal offsets, plus the taps of a pinned string of 2**bits resistors of relative deviation
    resistor_sigma (b_k = sum of the first k deviations less k / 2**bits of them all), plus systematic_lsb, the same in
    every array. The same threshold of all arrays lies side by side in memory, as judge_arrays likes it. Raises
    ValueError for negative deviations.
    """
    if not (offset_sigma_lsb >= 0 and resistor_sigma >= 0):
        raise ValueError(
            f"deviations must not be negative, found {offset_sigma_lsb!r} LSB and {resistor_sigma!r}"
        )
    units = 2**bits
    errors = generator.standard_normal((units - 1, arrays))
    errors *= offset_sigma_lsb
    if resistor_sigma > 0:
        steps = generator.standard_normal((units, arrays))
        steps *= resistor_sigma
        np.cumsum(steps, axis=0, out=steps)
        errors += steps[:-1]
        errors -= np.arange(1, units)[:, np.newaxis] / units * steps[-1]
    if systematic_lsb is not None:
        errors += np.asarray(systematic_lsb, dtype=np.float64)[:, np.newaxis]
    return errors.T


def judge_arrays(
    errors: NDArray[np.float64], fit: Fit, dnl_lsb: float, inl_lsb: float
) -> Judgement:
    """Judge arrays by their threshold errors (arrays, M), in LSB, against both goals.

    An array passes with max |DNL| < dnl_lsb and max |INL| < inl_lsb, both from the line `fit` (see dnl_inl). Worked
    off in blocks that stay in cache; nothing of the size of `errors` is allocated.
    """
    arrays, count = errors.shape
    max_dnl, max_inl = np.empty(arrays), np.empty(arrays)
    width = max(_WIDTH, _BLOCK // count)
    ramp = np.arange(count, dtype=np.float64)[:, np.newaxis]
    work = np.empty((count, min(width, arrays)))
    for begin in range(0, arrays, width):
        part = slice(begin, begin + width)
        block = errors[part].T
        room = work[:, : block.shape[1]]
        line, slope = (v[:, 0] for v in fitted_line(block.T, fit))
        step = slope - 1.0
        # what a line takes off does not change which code is the widest: take it off the extremes alone
        difference = np.subtract(block[1:], block[:-1], out=room[1:])
        high, low = difference.max(axis=0), difference.min(axis=0)
        np.maximum(high - step, step - low, out=max_dnl[part])
        residual = block
        if fit != "none":
            residual = np.multiply(ramp, step, out=room)
            np.subtract(block, residual, out=residual)
        high, low = residual.max(axis=0), residual.min(axis=0)
        np.maximum(high - line, line - low, out=max_inl[part])
        max_dnl[part] /= slope
        max_inl[part] /= slope
    return Judgement((max_dnl < dnl_lsb) & (max_inl < inl_lsb), max_dnl, max_inl)


def code_percentiles(
    errors: NDArray[np.float64], fit: Fit, percent: ArrayLike
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return percentiles over arrays of each code's DNL, (percents, M - 1), and each threshold's INL, (percents, M).

    errors (arrays, M) in LSB; percent (percents,) from 0 to 100; results in LSB of the line `fit`.
    """
    dnl, inl = dnl_inl(errors, fit)
    at = np.asarray(percent, dtype=np.float64)
    return np.percentile(dnl, at, axis=0), np.percentile(inl, at, axis=0)
