"""The instant at which a clocked cell samples its input, and how it scatters with mismatch."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.bench.linear import (
    central_differences,
    input_referred,
    shifted_each,
)
from flashplan.cell.bench.setup import Setup, reset_state

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Aperture:
    """instant: centre of the input's weight after the clock's mid-edge, s; skew_sigma s; by device (devices,) s."""

    instant: float
    skew_sigma: float
    by_device: Floats


def measure_aperture(setup: Setup) -> Aperture:
    """Sampling instant from the response to a slow ramp, its scatter from that response with each device shifted.

    With an input v + s t the cell decides on v + s t_a: the extra input-referred shift over the slope is t_a. The
    scatter adds each device's own sigma in quadrature; the clock tree's scatter is not the cell's and not in it.
    """
    network = setup.network
    # A ramp that moves a tenth of a millivolt over the clock's edge: linear, yet far above rounding.
    rate = 1e-4 / setup.edge
    parameters = shifted_each(
        setup, network.threshold_sigma, np.maximum(network.beta_sigma, 1e-6)
    )
    instances = parameters.threshold.shape[1]
    start = reset_state(setup, parameters, instances)
    # Each shifted device also moves the offset; the input takes that back, so that all stay in the linear range.
    offset = input_referred(setup, parameters, start)
    up = input_referred(setup, parameters, start, rate, -offset)
    down = input_referred(setup, parameters, start, -rate, -offset)
    instants = (up - down) / (2.0 * rate)
    threshold, current = central_differences(instants)
    by_device = np.sqrt(threshold**2 + current**2)
    return Aperture(
        instant=float(np.mean(instants)),
        skew_sigma=float(np.sqrt(np.sum(by_device**2))),
        by_device=by_device,
    )
