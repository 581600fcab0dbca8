"""Moving inputs of a continuous cell: the narrowest pulse it decides, and chatter on a slow noisy input."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.cell.bench.transfer import StaticSetup, driven_levels, rest_state
from flashplan.cell.circuit import Drive, slopes
from flashplan.cell.integrate import Trajectory, integrate

Floats = NDArray[np.float64]

# Input difference and its slope at a time, each (instances,).
Waveform = Callable[[float], tuple[Floats, Floats]]

_FULL = 0.9  # part of the supply that the output must reach for a full transition
_TOLERANCE = 1e-4  # part of the supply, per step
_PIECES = 200  # of a long waveform, at least, so that no step leaps over its detail


@dataclass(frozen=True)
class PulseResponse:
    """amplitude V and width s of each pulse, highest output V, delay s from its start to half the supply (NaN: never);
    decided: the output made a full transition."""

    amplitude: Floats
    width: Floats
    peak: Floats
    delay: Floats
    decided: NDArray[np.bool_]
    failed: NDArray[np.bool_]

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON types."""
        return {
            "amplitude": self.amplitude.tolist(),
            "width": self.width.tolist(),
            "peak": self.peak.tolist(),
            "delay": [float(d) if np.isfinite(d) else None for d in self.delay],
            "decided": self.decided.tolist(),
            "failed": int(self.failed.sum()),
        }


@dataclass(frozen=True)
class Chatter:
    """Output transitions (instances,) while the input crossed once; 1 is a clean decision."""

    transitions: NDArray[np.intp]
    failed: int


def pulse_response(
    setup: StaticSetup,
    amplitude: ArrayLike,
    width: ArrayLike,
    edge: float,
    after: float,
) -> PulseResponse:
    """Answer to pulses from -amplitude to +amplitude V about the reference input, width s at half height.

    amplitude and width broadcast to (instances,); edge: rise and fall time, s; after: time watched after the widest.
    """
    high, wide = (
        a.astype(float)
        for a in np.broadcast_arrays(np.atleast_1d(amplitude), np.atleast_1d(width))
    )

    def waveform(time: float) -> tuple[Floats, Floats]:
        up, up_slope = _edges(time / edge * np.ones_like(wide))
        down, down_slope = _edges((time - wide) / edge)
        return high * (2.0 * (up - down) - 1.0), 2.0 * high * (
            up_slope - down_slope
        ) / edge

    breaks = sorted({0.0, edge, *wide.tolist(), *(wide + edge).tolist()})
    path = follow(
        setup, waveform, high.size, float(wide.max()) + edge + after, breaks, edge
    )
    output = path.voltages[:, _out(setup)]
    half = setup.network.supply / 2.0
    delay = np.array([_rise(path.time, output[:, k], half) for k in range(high.size)])
    peak = output.max(axis=0)
    return PulseResponse(
        high,
        wide,
        peak,
        delay - edge / 2.0,
        peak >= _FULL * setup.network.supply,
        path.failed,
    )


def chatter(
    setup: StaticSetup,
    reach: float,
    time: float,
    noise_sigma: float,
    bandwidth: float,
    instances: int,
    generator: np.random.Generator,
) -> Chatter:
    """Count output transitions on a ramp from -reach to +reach V in `time` s with noise on it.

    The noise is a sum of 64 sines of random phase spread evenly up to `bandwidth` Hz, its root mean square
    noise_sigma V.
    """
    sines = 64
    frequency = bandwidth * (np.arange(sines)[:, None] + 0.5) / sines
    phase = generator.uniform(0.0, 2.0 * np.pi, (sines, instances))
    size = noise_sigma * np.sqrt(2.0 / sines)
    rate = 2.0 * reach / time

    def waveform(when: float) -> tuple[Floats, Floats]:
        angle = 2.0 * np.pi * frequency * when + phase
        value = -reach + rate * when + size * np.sin(angle).sum(axis=0)
        slope = rate + size * (2.0 * np.pi * frequency * np.cos(angle)).sum(axis=0)
        return value, slope

    path = follow(setup, waveform, instances, time, [], 0.25 / bandwidth)
    high = path.voltages[:, _out(setup)] > setup.network.supply / 2.0
    return Chatter((high[1:] != high[:-1]).sum(axis=0), int(path.failed.sum()))


def follow(
    setup: StaticSetup,
    waveform: Waveform,
    instances: int,
    time: float,
    breaks: list[float],
    largest_step: float,
) -> Trajectory:
    """Integrate the cell under an input waveform from its state at rest with the input at time 0."""
    network = setup.network
    row = network.circuit.driven.index("plus")
    first, _ = waveform(0.0)
    levels = driven_levels(setup, np.broadcast_to(first, (instances,)))
    rates = np.zeros_like(levels)

    def drive(when: float) -> tuple[Floats, Floats]:
        value, slope = waveform(when)
        levels[row], rates[row] = setup.common_mode + value, slope
        return levels, rates

    typed: Drive = drive
    start, lost = rest_state(setup, network.parameters, np.array(first))
    path = integrate(
        slopes(network, network.parameters, typed),
        start,
        (0.0, time),
        _TOLERANCE * network.supply,
        breaks,
        largest_step=min(largest_step, time / _PIECES),
    )
    return Trajectory(path.time, path.voltages, path.failed | lost)


def _edges(phase: Floats) -> tuple[Floats, Floats]:
    inside = np.clip(phase, 0.0, 1.0)
    return 0.5 - 0.5 * np.cos(np.pi * inside), 0.5 * np.pi * np.sin(np.pi * inside)


def _rise(time: Floats, values: Floats, level: float) -> float:
    above = np.flatnonzero(values >= level)
    if not above.size or above[0] == 0:
        return float("nan")
    k = int(above[0])
    return float(np.interp(level, values[k - 1 : k + 1], time[k - 1 : k + 1]))


def _out(setup: StaticSetup) -> int:
    return setup.network.circuit.free.index(setup.network.circuit.outputs[0])
