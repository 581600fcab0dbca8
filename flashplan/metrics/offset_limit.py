"""The largest mismatch that still meets a linearity yield: the exact yield, inverted."""

import math
from collections.abc import Callable

from numpy.typing import ArrayLike
from scipy.optimize import brentq

from flashplan.metrics.exact_yield import linearity_yield
from flashplan.metrics.linearity import Fit


class YieldUnreachable(ValueError):
    """No offset is small enough: what else moves the thresholds misses the yield alone.

    yield_at_zero: the yield that is left when the offsets vanish.
    """

    def __init__(self, goal: float, yield_at_zero: float) -> None:
        self.yield_at_zero = yield_at_zero
        super().__init__(
            f"a yield of {goal:g} is out of reach: without any offset it is {yield_at_zero:.6g}"
        )


def largest_offset_sigma(
    bits: int,
    yield_goal: float,
    dnl_lsb: float,
    inl_lsb: float,
    fit: Fit,
    resistor_sigma: float = 0.0,
    systematic_lsb: ArrayLike | None = None,
) -> float:
    """Return the largest standard deviation of the offsets, in LSB, that meets the yield goal.

    Arguments as linearity_yield's; yield_goal between 0 and 1. Raises YieldUnreachable when resistors and systematic
    errors alone miss it, ValueError for arguments out of range.

    >>> print(f"{largest_offset_sigma(6, 0.999, math.inf, 0.5, 'none'):.5f}")
    0.11585
    """

    def log_loss(sigma: float) -> float:
        return _log_odds(
            linearity_yield(
                bits, sigma, dnl_lsb, inl_lsb, fit, resistor_sigma, systematic_lsb
            ).loss
        )

    goal = min(dnl_lsb, inl_lsb)
    return _largest(log_loss, yield_goal, goal)


def _log_odds(loss: float) -> float:
    return math.log(max(loss, 1e-300))


def _largest(
    log_loss: Callable[[float], float], yield_goal: float, scale: float
) -> float:
    target = math.log1p(-yield_goal)
    low, high = math.log(scale / 30), math.log(scale * 2)
    return math.exp(
        brentq(lambda t: log_loss(math.exp(t)) - target, low, high, xtol=1e-9)
    )
