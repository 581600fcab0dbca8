"""DNL and INL of an array of thresholds, taken from a stated reference line."""

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

Fit = Literal["none", "endpoint", "best"]
FITS: tuple[Fit, ...] = ("none", "endpoint", "best")


def dnl_inl(
    errors: ArrayLike, fit: Fit
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return DNL of the inner codes (..., M - 1) and INL of the thresholds (..., M), both in LSB of the fitted line.

    Threshold k sits at T_k = k + e_k, in LSB. A line T = a + g k is taken from all T_k, then
    INL_k = (T_k - a) / g - k and DNL_k = (T_{k+1} - T_k) / g - 1.

    errors: e_k in LSB, (..., M), lowest threshold first, M >= 2. fit: "none" leaves the ideal line (a = 0, g = 1);
    "endpoint" goes through the first and the last threshold, so that 1 LSB is the mean actual step; "best" is the
    least-squares line. Raises ValueError for another fit or fewer than two thresholds.
    Source: IEEE Std 1241-2010, definitions of differential and integral nonlinearity (memory).

    >>> dnl, inl = dnl_inl([0.0, 0.5, 0.0], "endpoint")
    >>> dnl.tolist(), inl.tolist()
    ([0.5, -0.5], [0.0, 0.5, 0.0])
    """
    error = np.asarray(errors, dtype=np.float64)
    if error.ndim == 0 or error.shape[-1] < 2:
        raise ValueError("at least two thresholds are needed")
    start, slope = fitted_line(error, fit)
    inl = error - start
    if fit != "none":
        inl -= (slope - 1.0) * np.arange(error.shape[-1])
        inl /= slope
    return np.diff(inl, axis=-1), inl


def fitted_line(
    error: NDArray[np.float64], fit: Fit
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the fitted line's error at the first threshold, in LSB, and its slope (1 + relative LSB error).

    error: (..., M) in LSB; both results (..., 1). Raises ValueError for another fit.
    """
    last = error.shape[-1] - 1
    if fit == "none":
        return np.zeros((*error.shape[:-1], 1)), np.ones((*error.shape[:-1], 1))
    if fit == "endpoint":
        return error[..., :1], 1.0 + (error[..., -1:] - error[..., :1]) / last
    if fit == "best":
        lever = np.arange(last + 1) - last / 2
        weights = np.stack([np.full(last + 1, 1 / (last + 1)), lever / (lever @ lever)])
        line = error @ weights.T  # mean and tilt in one pass over the errors
        return line[..., :1] - line[..., 1:] * last / 2, 1.0 + line[..., 1:]
    raise ValueError(f'fit must be "none", "endpoint" or "best", found {fit!r}')
