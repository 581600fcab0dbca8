"""The part of all arrays that meets a linearity goal, from integrals alone: no draws, no interval."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.metrics.best_fit_yield import best_fit_yield
from flashplan.metrics.end_point_yield import end_point_yield
from flashplan.metrics.fixed_line_yield import fixed_line_yield
from flashplan.metrics.linearity import FITS, Fit, dnl_inl
from flashplan.metrics.offset_density import NormalOffsets, OffsetDensity
from flashplan.metrics.string_alone import string_alone_yield


@dataclass(frozen=True, slots=True)
class YieldResult:
    """Part of arrays that meet the goal and part that do not, each accurate to its own size."""

    yield_: float
    loss: float

    def to_dict(self) -> dict[str, float]:
        """Plain numbers for JSON."""
        return {"yield": self.yield_, "loss": self.loss}


def linearity_yield(
    bits: int,
    offset_sigma_lsb: float,
    dnl_lsb: float,
    inl_lsb: float,
    fit: Fit,
    resistor_sigma: float = 0.0,
    systematic_lsb: ArrayLike | None = None,
    offset_density: OffsetDensity | None = None,
    refine: int = 0,
) -> YieldResult:
    """Return the part of all arrays with max |DNL| < dnl_lsb and max |INL| < inl_lsb.

    Threshold k is off by an independent offset, the movement of tap k of a pinned string of 2**bits resistors, and
    systematic_lsb[k - 1]. The thresholds form a Markov chain: the yield is one integral operator applied 2**bits - 2
    times, and an end-point line is averaged over the two outer offsets.

    offset_sigma_lsb: standard deviation of a normal offset, in LSB; offset_density: any other density in its
    place (see offset_density.py). dnl_lsb, inl_lsb: goals in LSB, > 0; math.inf switches one off. fit: the reference line, see dnl_inl.
    resistor_sigma: relative standard deviation of one resistor. systematic_lsb: (2**bits - 1,) in LSB. refine: further
    nodes per panel, to show that the answer stands. Raises ValueError for arguments out of range.

    Relative error, of yield and loss alike down to 1e-9: below 1e-6 for fit "none" without resistor mismatch; below
    1e-3 for "none" and "endpoint" in all, and for "best" without resistors. "best" with resistors is within 1e-3 of
    the yield where that is above 0.8 (5e-3 below, 1e-2 for less than 5 bits and a string that moves more than the
    offsets). Offsets below smallest_offset_sigma are interpolated, within 5e-3 of the yield.

    >>> result = linearity_yield(6, 0.1159, math.inf, 0.5, "none")  # 63 thresholds within half an LSB
    >>> print(f"{result.yield_:.4f}")
    0.9990
    """
    check_goals(bits, dnl_lsb, inl_lsb, fit, resistor_sigma)
    systematic = _per_threshold(bits, systematic_lsb)
    goals = (bits, dnl_lsb, inl_lsb, fit, resistor_sigma, systematic, refine)
    if offset_density is not None:
        return _solve(offset_density, *goals)
    if not 0 <= offset_sigma_lsb < math.inf:
        raise ValueError(
            f"the offset's sigma must be zero or more and finite, found {offset_sigma_lsb!r} LSB"
        )
    lowest = smallest_offset_sigma(bits, resistor_sigma)
    if offset_sigma_lsb == 0 and resistor_sigma == 0:
        dnl, inl = (np.abs(v).max() for v in dnl_inl(systematic, fit))
        passes = float(dnl < dnl_lsb and inl < inl_lsb)
        return YieldResult(passes, 1.0 - passes)
    if offset_sigma_lsb >= lowest:
        return _solve(NormalOffsets(offset_sigma_lsb), *goals)
    alone = string_alone_yield(bits, dnl_lsb, inl_lsb, fit, resistor_sigma, systematic)
    if offset_sigma_lsb == 0:
        return YieldResult(alone, 1.0 - alone)
    # between no offset and the lowest that the quadrature resolves: nearly a parabola
    least, most = (
        -math.log(max(alone, 1e-300)),
        hazard_of(_solve(NormalOffsets(lowest), *goals)),
    )
    rate = least + (most - least) * (offset_sigma_lsb / lowest) ** 2
    return YieldResult(math.exp(-rate), -math.expm1(-rate))


def smallest_offset_sigma(bits: int, resistor_sigma: float) -> float:
    """The normal offset's sigma, in LSB, below which linearity_yield interpolates towards zero.

    A quarter of the largest deviation of a string's tap; the chain then needs too many modes.
    """
    return 0.25 * 0.5 * resistor_sigma * math.sqrt(2**bits)


def _solve(
    density: OffsetDensity,
    bits: int,
    dnl: float,
    inl: float,
    fit: Fit,
    resistor_sigma: float,
    systematic: NDArray[np.float64],
    refine: int,
) -> YieldResult:
    if density.kinks and (
        resistor_sigma > 0 or systematic.any() or fit != "none"
    ):  # kinks would move from threshold to threshold
        raise ValueError(
            "a density with a jump or a bounded support works with fit none alone, without resistor mismatch and "
            "systematic errors; give it a soft edge"
        )
    solve = {
        "none": fixed_line_yield,
        "endpoint": end_point_yield,
        "best": best_fit_yield,
    }[fit]
    loss, survive = solve(bits, density, dnl, inl, resistor_sigma, systematic, refine)
    loss, survive = min(max(loss, 0.0), 1.0), min(max(survive, 0.0), 1.0)
    if loss > survive:  # the smaller of the two keeps its relative accuracy
        return YieldResult(survive, 1.0 - survive)
    return YieldResult(1.0 - loss, loss)


def hazard_of(result: YieldResult) -> float:
    """-log(yield)."""
    if result.loss < 0.5:
        return -math.log1p(-result.loss)
    return -math.log(max(result.yield_, 1e-300))


def _per_threshold(bits: int, systematic: ArrayLike | None) -> NDArray[np.float64]:
    count = 2**bits - 1
    if systematic is None:
        return np.zeros(count)
    errors = np.asarray(systematic, dtype=np.float64)
    if errors.shape != (count,) or not np.isfinite(errors).all():
        raise ValueError(
            f"systematic errors must be {count} finite numbers, one for each threshold"
        )
    return errors


def check_goals(
    bits: int, dnl_lsb: float, inl_lsb: float, fit: str, resistor_sigma: float
) -> None:
    """Raise ValueError for a converter or goals that have no yield."""
    if bits not in range(2, 13):
        raise ValueError(f"bits must be a whole number from 2 to 12, found {bits!r}")
    for name, goal in (("DNL", dnl_lsb), ("INL", inl_lsb)):
        if not goal > 0:
            raise ValueError(f"the {name} goal must be above zero, found {goal!r} LSB")
    if fit not in FITS:
        raise ValueError(f"fit must be one of {', '.join(FITS)}, found {fit!r}")
    if not 0 <= resistor_sigma < 1:
        raise ValueError(
            f"the resistors' sigma must be from 0 to below 1, found {resistor_sigma!r}"
        )
