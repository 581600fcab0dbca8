"""Gain and offset error of a static transfer curve, and where it falls."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.metrics.linearity import Fit, fitted_line


@dataclass(frozen=True, slots=True)
class TransferErrors:
    """Gain and offset errors of converters, each (...,): gain T_k + offset = k + what is left, in LSB.

    gain_error: gain - 1, positive where codes rise faster than they should; offset_lsb: positive where they come too
    high.
    """

    gain_error: NDArray[np.float64]
    offset_lsb: NDArray[np.float64]

    def to_dict(self) -> dict[str, Any]:
        """Return the fields as plain numbers, or lists of them."""
        return {
            "gain_error": self.gain_error.tolist(),
            "offset_lsb": self.offset_lsb.tolist(),
        }


def gain_and_offset(errors: ArrayLike, fit: Fit) -> TransferErrors:
    """Return the gain and offset that take the thresholds onto their ideal places k = 1, 2, ..., in LSB.

    errors: T_k - k in LSB, (..., M). fit: "endpoint" (terminal-based) sets the first and the last threshold right,
    "best" (independently based) lets a least-squares line through T_k over k fall onto k, "none" finds nothing. DNL
    and INL with the same fit are what is left, taken in the actual LSB.
    Raises ValueError for another fit. Source: IEEE Std 1241-2010, gain and offset (memory).

    >>> found = gain_and_offset([0.2, 0.3, 0.4], "endpoint")   # steps 10 % too wide
    >>> print(f"{found.gain_error:.4f} {found.offset_lsb:.4f}")
    -0.0909 -0.0909
    """
    start, slope = fitted_line(np.asarray(errors, dtype=np.float64), fit)
    return TransferErrors(
        gain_error=1.0 / slope[..., 0] - 1.0,
        offset_lsb=1.0 - (1.0 + start[..., 0]) / slope[..., 0],
    )


def falling_steps(curve: ArrayLike) -> NDArray[np.int64]:
    """Return each place k where a curve (n,) falls from k to k + 1; none where it is monotonic.

    curve: output against rising input, or thresholds against code.

    >>> falling_steps([0.0, 1.0, 0.9, 2.0])
    array([1])
    """
    return np.flatnonzero(np.diff(np.asarray(curve, dtype=np.float64)) < 0)
