"""Yield when DNL and INL are taken from the ideal line: nothing is fitted away."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.gaussian_path import GaussianPath, modes_needed, pinned_path
from flashplan.metrics.long_chain import (
    extrapolate,
    hazard,
    hazard_per_threshold,
    may_squeeze,
    resample,
)
from flashplan.metrics.offset_density import OffsetDensity
from flashplan.metrics.threshold_chain import (
    Stretch,
    homogeneous_chain,
    make_band,
    stepped_chain,
)

Array = NDArray[np.float64]
StringPath = Callable[[float, float, Array, int], GaussianPath]


def fixed_line_yield(
    bits: int,
    density: OffsetDensity,
    dnl: float,
    inl: float,
    resistor_sigma: float,
    systematic: Array,
    refine: int = 0,
) -> tuple[float, float]:
    """Return loss and yield; arguments as linearity_yield's.

    Equal thresholds take the logarithm of their number in time.
    """
    if resistor_sigma == 0 and not systematic.any():
        band = make_band(
            min(inl, density.reach),
            dnl,
            density,
            density.kinks,
            2.8 * (1 + 0.25 * refine),
        )
        return homogeneous_chain(band, density, 2**bits - 2)
    hazards = shifted_hazards(
        density,
        dnl,
        inl,
        resistor_sigma,
        -systematic[:, np.newaxis],
        np.ones(1),
        refine,
    )
    return float(-np.expm1(-hazards[0])), float(np.exp(-hazards[0]))


def shifted_hazards(
    density: OffsetDensity,
    dnl: float,
    inl: float,
    resistor_sigma: float,
    shift: NDArray,
    gains: Array,
    refine: int = 0,
    string_path: StringPath = pinned_path,
) -> NDArray:
    """Return -log(yield) with the thresholds moved and the goals scaled, for a batch of columns: (columns,).

    shift: minus the movement of each threshold in LSB, (2**bits - 1, columns), real or complex; gains (columns,):
    the LSB that the goals are in; string_path: what of the string's movement the thresholds take part in.
    """
    units = len(shift) + 1
    taps = np.arange(1.0, units)
    spread = string_path(units, resistor_sigma, taps, 1).deviation.max()
    farthest = 6 * spread + np.abs(shift.real).max()
    half = min(inl, (density.reach + farthest) / gains.min())
    band = make_band(half, dnl, density, (), 2.0 * (1 + 0.25 * refine))
    modes = modes_needed(spread / density.width) + 8 * refine
    squeeze = may_squeeze(shift, density.width)
    per_threshold = None
    if squeeze and resistor_sigma > 0:
        per_threshold = hazard_per_threshold(band, density, gains, farthest)

    def chain(length: int) -> NDArray:
        each = units / length
        taps = np.arange(1.0, length)
        path = string_path(length, resistor_sigma * np.sqrt(each), taps, modes)
        stretch = Stretch(resample(shift, length), gains, path, tied=False)
        loss, survive = stepped_chain(band, density, stretch, per_threshold, each - 1)
        return hazard(loss[:, 0], survive[:, 0])

    if not squeeze:
        return chain(units)
    return extrapolate(chain, units, grows=resistor_sigma == 0)
