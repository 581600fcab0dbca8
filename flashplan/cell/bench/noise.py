"""Input-referred noise of a clocked cell from a stochastic transient: many noisy decisions at plus and minus one sigma."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from flashplan.cell.bench.setup import (
    DECIDED,
    Setup,
    clock_drive,
    decide,
    output_rows,
    reset_state,
)
from flashplan.cell.circuit import device_voltages, with_driven
from flashplan.cell.device import channel_state
from flashplan.cell.device_noise import (
    flicker_voltage_variance,
    thermal_current_density,
)
from flashplan.cell.steady import jacobian_of

Floats = NDArray[np.float64]

# Flicker noise slower than the array's observation, and faster than the decision, does not count as noise of it.
FLICKER_BAND = (1.0, 1e9)  # Hz

_PACE = 0.7  # of the fastest node's time constant, for the fixed step


@dataclass(frozen=True)
class NoiseMeasurement:
    """sigma in V with its 95 % interval, from decisions at +-probe V; how many, and how many failed."""

    sigma: float
    low: float
    high: float
    probe: float
    decisions: int
    failed: int

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON types."""
        return {
            "sigma": self.sigma,
            "low": self.low,
            "high": self.high,
            "probe": self.probe,
            "decisions": self.decisions,
            "failed": self.failed,
        }


def measure_noise(
    setup: Setup, probe: float, decisions: int, generator: np.random.Generator
) -> NoiseMeasurement:
    """Noise from the part of decisions that go each way with the input at plus and minus `probe` V.

    sigma = probe / Phi^-1(P); best with a probe near sigma. Thermal noise of every device is drawn per step, flicker
    noise as a threshold shift per decision. Steps are fixed (Heun): 0.7 of the shortest time constant that the noiseless
    decision passes through, at which its fastest node is still well damped.
    """
    half = decisions // 2
    difference = np.repeat([probe, -probe], half)
    outputs, failed = noisy_decisions(setup, difference, generator)
    high = outputs > 0
    good = ~failed
    right = np.where(difference > 0, high, ~high) & good
    counted = int(good.sum())
    part = right.sum() / counted
    interval = stats.binomtest(int(right.sum()), counted).proportion_ci(
        0.95, method="wilson"
    )

    def sigma(p: float) -> float:
        z = float(stats.norm.ppf(min(p, 1.0 - 0.25 / counted)))
        return probe / z if z > 0 else float("inf")

    return NoiseMeasurement(
        sigma=sigma(float(part)),
        low=sigma(float(interval.high)),
        high=sigma(float(interval.low)),
        probe=probe,
        decisions=counted,
        failed=int(failed.sum()),
    )


def noisy_decisions(
    setup: Setup, difference: Floats, generator: np.random.Generator
) -> tuple[Floats, NDArray[np.bool_]]:
    """Outputs in V of one noisy decision for each input difference in V, and which of them failed."""
    network, parameters = setup.network, setup.network.parameters
    start = reset_state(setup, parameters, 1)
    quiet = decide(
        setup, parameters, start, float(np.abs(difference).max()), until=DECIDED
    )
    drive, _ = clock_drive(setup, difference, 0.0, None)
    driven = np.stack([drive(t)[0][:, 0] for t in quiet.trajectory.time], axis=1)
    states = np.moveaxis(quiet.trajectory.voltages[:, :, 0], 0, 1)
    along = jacobian_of(network, parameters, driven, states)
    step = _PACE / float(np.abs(np.linalg.eigvals(along)).max())
    instances = difference.size
    flicker = flicker_voltage_variance(
        network.flicker_factor, network.oxide_capacitance, network.area, *FLICKER_BAND
    )
    shift = np.sqrt(flicker)[:, None] * generator.standard_normal(
        (flicker.size, instances)
    )
    state = np.repeat(start, instances, axis=1)
    plus, minus = output_rows(network)
    failed = np.zeros(instances, dtype=bool)
    time, length = -setup.lead, setup.edge / 2.0 + setup.decision_time

    def rates(when: float, free: Floats, noise: Floats | None) -> tuple[Floats, Floats]:
        driven, driven_slope = drive(when)
        full = with_driven(free, driven)
        gate, drain, source = device_voltages(network, full)
        channel = channel_state(parameters, gate - shift, drain, source)
        if noise is None:
            density = thermal_current_density(parameters, channel, network.noise_factor)
            # A one-sided density S held over a step has the variance S / (2 step).
            noise = np.sqrt(density / (2.0 * step)) * generator.standard_normal(
                density.shape
            )
        slope = network.from_current @ (channel.current + noise)
        if network.circuit.resistors:
            slope += network.from_voltage @ full
        return slope + network.from_slope @ driven_slope, noise

    while time < length:
        first, noise = rates(time, state, None)
        second, _ = rates(time + step, state + step * first, noise)
        new = state + 0.5 * step * (first + second)
        failed |= ~np.isfinite(new).all(axis=0)
        state = np.where(failed, state, new)
        time += step
        apart = np.abs(state[plus] - state[minus])
        if time > setup.edge and apart.min() > DECIDED * network.supply:
            break
    return state[plus] - state[minus], failed
