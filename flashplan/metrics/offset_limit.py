"""The largest mismatch that still meets a linearity yield: the exact yield, inverted."""

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq
from scipy.special import log_ndtr

from flashplan.metrics.exact_yield import (
    YieldResult,
    check_goals,
    hazard_of,
    linearity_yield,
    smallest_offset_sigma,
)
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
    check_goals(bits, dnl_lsb, inl_lsb, fit, resistor_sigma)
    _check_inverse(yield_goal, dnl_lsb, inl_lsb)

    def result(sigma: float) -> YieldResult:
        return linearity_yield(
            bits, sigma, dnl_lsb, inl_lsb, fit, resistor_sigma, systematic_lsb
        )

    floor = smallest_offset_sigma(bits, resistor_sigma)
    if floor == 0.0 and result(0.0).yield_ == 0.0:
        raise YieldUnreachable(yield_goal, 0.0)
    return _largest(result, yield_goal, bits, dnl_lsb, inl_lsb, fit, floor)


def largest_mismatch_scale(
    bits: int,
    yield_goal: float,
    dnl_lsb: float,
    inl_lsb: float,
    fit: Fit,
    offset_part: float,
    resistor_part: float,
) -> float:
    """Return the largest scale c that meets the yield with offsets c offset_part and resistors c resistor_part.

    offset_part: offset sigma in LSB at scale 1, > 0; resistor_part: relative resistor sigma at scale 1. The rest as
    largest_offset_sigma's.
    """
    check_goals(bits, dnl_lsb, inl_lsb, fit, 0.0)
    _check_inverse(yield_goal, dnl_lsb, inl_lsb)
    if not 0 < offset_part < math.inf or not 0 <= resistor_part < math.inf:
        raise ValueError(
            f"expected an offset part above zero and a resistor part of zero or more, found {offset_part!r} and {resistor_part!r}"
        )

    def result(sigma: float) -> YieldResult:
        scale = sigma / offset_part
        return linearity_yield(
            bits, sigma, dnl_lsb, inl_lsb, fit, scale * resistor_part
        )

    sigma = _largest(result, yield_goal, bits, dnl_lsb, inl_lsb, fit)
    return sigma / offset_part


def _largest(
    result: Callable[[float], YieldResult],
    yield_goal: float,
    bits: int,
    dnl: float,
    inl: float,
    fit: Fit,
    floor: float = 0.0,
) -> float:
    """Solve for the sigma at which -log(yield) meets the goal's, on a logarithmic scale.

    The unknown is the logarithm of a rough model's -log(yield) (thresholds and codes taken as independent), in which
    the exact one is nearly a line of slope one, so that few exact evaluations do.
    """
    model = _rough_hazard(bits, dnl, inl, fit)
    target = math.log(-math.log(yield_goal))
    goal = min(dnl, inl)

    def sigma_at(rough: float) -> float:
        low, high = math.log(goal / 60), math.log(goal * 60)
        return math.exp(
            brentq(lambda t: model(math.exp(t)) - rough, low, high, xtol=1e-13)
        )

    def excess(sigma: float) -> float:
        return math.log(max(hazard_of(result(sigma)), 1e-300)) - target

    floor = max(floor, goal / 50)
    at, step, known = target, 0.0, []
    for _ in range(40):
        at += step
        sigma = sigma_at(max(at, model(floor)))
        if sigma <= floor * (1 + 1e-9):
            return _below(excess, result, yield_goal, floor)
        known.append((at, excess(sigma)))
        if abs(known[-1][1]) < 1e-9:
            return sigma
        step = -known[-1][1]
        if len(known) > 1:
            (x0, y0), (x1, y1) = known[-2:]
            step /= max((y1 - y0) / (x1 - x0), 0.01)  # flat where no sigma will do
        if abs(step) < 1e-7:  # the next error is far smaller still
            return sigma_at(at + step)
    # a string that dominates counts passes one by one: look for the jump
    return brentq(excess, floor, 2 * goal, rtol=1e-8)


def _below(
    excess: Callable[[float], float],
    result: Callable[[float], YieldResult],
    yield_goal: float,
    floor: float,
) -> float:
    """The solution between no offset at all and the floor, or YieldUnreachable."""
    at_zero = result(0.0).yield_
    if at_zero <= yield_goal:
        raise YieldUnreachable(yield_goal, at_zero)
    return brentq(excess, 0.0, floor, rtol=1e-8)


def _rough_hazard(
    bits: int, dnl: float, inl: float, fit: Fit
) -> Callable[[float], float]:
    """log(-log(yield)) of offsets as if all thresholds and codes were independent, by sigma in LSB."""
    steps = 2**bits - 2
    spread = np.ones(1)
    if fit == "endpoint":
        t = (np.arange(min(steps, 32)) + 0.5) / min(steps, 32)
        spread = np.sqrt(1 + t**2 + (1 - t) ** 2)
    codes, thresholds = math.log(steps), math.log((steps + 1) / len(spread))

    def model(sigma: float) -> float:
        rates = []
        if dnl < math.inf:
            rates.append(codes + _log_hazard(np.array([math.sqrt(2) * sigma / dnl])))
        if inl < math.inf:
            rates.append(thresholds + _log_hazard(sigma * spread / inl))
        return float(np.logaddexp.reduce(np.concatenate(rates)))

    return model


def _log_hazard(sigma: NDArray[np.float64]) -> NDArray[np.float64]:
    """log(-log P(|e| < 1)) of a normal e, through logarithms, so that no sigma underflows."""
    failing = np.minimum(log_ndtr(-1.0 / sigma) + math.log(2), -1e-12)
    return failing - 0.5 * np.log1p(
        -np.exp(failing)
    )  # -log(1 - f) = f / sqrt(1 - f), nearly


def _check_inverse(yield_goal: float, dnl: float, inl: float) -> None:
    if not 0 < yield_goal < 1:
        raise ValueError(
            f"the yield goal must be between 0 and 1, exclusive, found {yield_goal!r}"
        )
    if math.isinf(dnl) and math.isinf(inl):
        raise ValueError(
            "with neither a DNL nor an INL goal any offset will do; give one"
        )
