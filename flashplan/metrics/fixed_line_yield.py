"""Yield when DNL and INL are taken from the ideal line: nothing is fitted away."""

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.offset_density import OffsetDensity
from flashplan.metrics.resistor_bridge import make_bridge, modes_needed
from flashplan.metrics.threshold_chain import (
    Stretch,
    homogeneous_chain,
    make_band,
    stepped_chain,
)


def fixed_line_yield(
    bits: int,
    density: OffsetDensity,
    dnl: float,
    inl: float,
    resistor_sigma: float,
    systematic: NDArray[np.float64],
    refine: int = 0,
) -> tuple[float, float]:
    """Return loss and yield; arguments as linearity_yield's.

    Equal thresholds take the logarithm of their number in time; resistor mismatch or systematic errors take it whole.
    """
    units = 2**bits
    if resistor_sigma == 0 and not systematic.any():
        band = make_band(min(inl, density.reach), dnl, density, refine=refine)
        return homogeneous_chain(band, density, units - 2)
    spread = 0.5 * resistor_sigma * np.sqrt(units)
    farthest = density.reach + 6 * spread + np.abs(systematic).max()
    band = make_band(min(inl, farthest), dnl, density, refine=refine)
    bridge = make_bridge(
        units, resistor_sigma, modes_needed(spread, density.width) + 4 * refine
    )
    stretch = Stretch(-systematic[:, np.newaxis], np.ones(1), bridge, 1, tied=False)
    loss, survive = stepped_chain(band, density, stretch)
    return float(loss[0]), float(survive[0])
