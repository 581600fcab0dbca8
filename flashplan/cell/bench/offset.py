"""Offset of a clocked cell: by transient bisection of every mismatch draw, and by linear sensitivities."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from flashplan.cell.bench.linear import (
    central_differences,
    input_referred,
    shifted_each,
)
from flashplan.cell.bench.setup import DECIDED, Setup, decide, reset_state
from flashplan.cell.circuit import with_mismatch
from flashplan.cell.device import DeviceParameters
from flashplan.cell.mismatch import draw_mismatch

Floats = NDArray[np.float64]

_CHUNK = 1000  # instances at once: the working set of one device evaluation stays in the cache
_CONFIDENCE = 0.95


@dataclass(frozen=True)
class OffsetPrediction:
    """Linear prediction: sigma in V, and each device's contribution to it by threshold and by current, (devices,) V."""

    sigma: float
    from_threshold: Floats
    from_current: Floats


@dataclass(frozen=True)
class OffsetDistribution:
    """Offsets of the draws that were decided, in V; mean, sigma with its 95 % interval; how many failed.

    resolution: width of the last bracket, in V; unbracketed: draws whose offset lies beyond the search range.
    """

    offsets: Floats
    mean: float
    sigma: float
    low: float
    high: float
    resolution: float
    failed: int
    unbracketed: int

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON types, without the single draws."""
        return {
            "mean": self.mean,
            "sigma": self.sigma,
            "low": self.low,
            "high": self.high,
            "draws": int(self.offsets.size),
            "failed": self.failed,
            "unbracketed": self.unbracketed,
            "resolution": self.resolution,
        }


def predict_offset(setup: Setup) -> OffsetPrediction:
    """Offset sigma from the response to a small shift of each device in turn: sigma^2 = sum (S sigma_device)^2."""
    network = setup.network
    step_v, step_b = 1e-4, 1e-3
    parameters = shifted_each(setup, step_v, step_b)
    start = reset_state(setup, parameters, parameters.threshold.shape[1])
    threshold, current = central_differences(input_referred(setup, parameters, start))
    from_threshold = np.abs(threshold / step_v) * network.threshold_sigma
    from_current = np.abs(current / step_b) * network.beta_sigma
    sigma = float(np.sqrt(np.sum(from_threshold**2) + np.sum(from_current**2)))
    return OffsetPrediction(sigma, from_threshold, from_current)


def bisect_offset(
    setup: Setup,
    parameters: DeviceParameters,
    start: Floats,
    reach: float,
    resolution: float,
) -> tuple[Floats, NDArray[np.bool_], NDArray[np.bool_]]:
    """Input at which each instance's decision turns, by bisection: (offsets in V, failed, unbracketed).

    parameters and start of as many instances; reach: half the first bracket, in V, doubled up to three times for
    instances that decide alike at both of its ends; resolution: width of the last bracket.
    """
    instances = start.shape[1]
    failed = np.zeros(instances, dtype=bool)

    def high(difference: Floats) -> NDArray[np.bool_]:
        decision = decide(setup, parameters, start, difference, until=DECIDED)
        np.logical_or(failed, decision.trajectory.failed, out=failed)
        return decision.output[-1] > 0

    lower, upper = np.full(instances, -reach), np.full(instances, reach)
    outside = np.zeros(instances, dtype=bool)
    for _ in range(4):
        below, above = high(lower), high(upper)
        outside = (below | ~above) & ~failed
        if not outside.any():
            break
        lower[outside & below] *= 2.0
        upper[outside & ~above] *= 2.0
    while float((upper - lower).max()) > resolution:
        middle = 0.5 * (lower + upper)
        up = high(middle)
        upper, lower = np.where(up, middle, upper), np.where(up, lower, middle)
    # The input that just decides high is minus what the cell adds: the offset as seen at the input.
    return 0.5 * (lower + upper), failed, outside


def offset_distribution(
    setup: Setup,
    draws: int,
    generator: np.random.Generator,
    expected_sigma: float,
    resolution: float | None = None,
) -> OffsetDistribution:
    """Offset of many mismatch draws, each by bisection of its decisions.

    expected_sigma in V sets the first bracket (5 sigma) and, unless given, the resolution (sigma/50). Draws that fail
    to integrate or lie beyond 40 sigma are counted and left out of the statistics.
    """
    network = setup.network
    resolution = expected_sigma / 50.0 if resolution is None else resolution
    threshold = draw_mismatch(network.threshold_sigma, draws, generator)
    beta = draw_mismatch(network.beta_sigma, draws, generator)
    found, lost, beyond = [], [], []
    for first in range(0, draws, _CHUNK):
        part = slice(first, min(first + _CHUNK, draws))
        parameters = with_mismatch(
            network.parameters, threshold[:, part], beta[:, part]
        )
        start = reset_state(setup, parameters, threshold[:, part].shape[1])
        offsets, failed, outside = bisect_offset(
            setup, parameters, start, 5.0 * expected_sigma, resolution
        )
        found.append(offsets)
        lost.append(failed)
        beyond.append(outside)
    offsets, failed = np.concatenate(found), np.concatenate(lost)
    outside = np.concatenate(beyond) & ~failed
    return describe_offsets(offsets, failed, outside, resolution)


def describe_offsets(
    offsets: Floats,
    failed: NDArray[np.bool_],
    outside: NDArray[np.bool_],
    resolution: float,
) -> OffsetDistribution:
    """Mean and standard deviation of the good draws with the chi-square interval of a normal distribution."""
    good = offsets[~failed & ~outside]
    if good.size < 2:
        raise ValueError("fewer than two draws were decided; no distribution")
    sigma, freedom = float(good.std(ddof=1)), good.size - 1
    tail = (1.0 - _CONFIDENCE) / 2.0
    return OffsetDistribution(
        offsets=good,
        mean=float(good.mean()),
        sigma=sigma,
        low=sigma * float(np.sqrt(freedom / stats.chi2.ppf(1.0 - tail, freedom))),
        high=sigma * float(np.sqrt(freedom / stats.chi2.ppf(tail, freedom))),
        resolution=resolution,
        failed=int(failed.sum()),
        unbracketed=int(outside.sum()),
    )
