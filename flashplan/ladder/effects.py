"""What moves the taps of a ladder: layout, leads, bias, feedthrough and noise; and the error power it costs."""

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import Boltzmann
from scipy.sparse import csc_array
from scipy.sparse.linalg import splu

from flashplan.ladder.network import Network, ac_voltages, dc_voltages
from flashplan.ladder.reference import Reference, build_reference
from flashplan.metrics.sine import sine_positions, sine_weights
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]

TEMPERATURE = 300.0  # K


def rest_voltages(reference: Reference) -> Floats:
    """Thresholds at rest, with bias currents and all that is in the network, in V: (M,)."""
    return reference.taps @ dc_voltages(reference.network) + reference.held


def rest_errors(plan: Plan, total_resistance: float) -> dict[str, Floats]:
    """Errors at rest in LSB by effect, each (M,); they sum to the whole error.

    gradient: the units differ; turns: what a folded string's turns add to it; lead: what leads and references add to
    both; bias: what the bias currents add to all.
    """
    quiet: dict[str, dict[str, float | int]] = {
        "bias": {"bias_current": 0.0},
        "lead": {
            "end_resistance": 0.0,
            "reference_resistance": 0.0,
            "lead_inductance": 0.0,
        },
        "turns": {"turn_resistance": 0.0},
        "gradient": {"gradient_linear": 0.0, "gradient_quadratic": 0.0},
    }
    ladder = plan.ladder
    ideal = np.arange(1, plan.comparators + 1) * plan.lsb
    errors = {name: np.zeros(plan.comparators) for name in quiet}
    above = _without_cell(plan, total_resistance)
    for name, off in quiet.items():
        if all(getattr(ladder, key) == 0 for key in off):
            continue
        ladder = ladder.model_copy(update=off)
        below = _without_cell(
            plan.model_copy(update={"ladder": ladder}), total_resistance
        )
        errors[name] = (above - below) / plan.lsb
        above = below
    # What a solver's rounding leaves of an ideal string is no error of the ladder; it must not be more than that.
    assert np.abs(above - ideal).max() < 1e-6 * plan.lsb
    return errors


def _without_cell(plan: Plan, total_resistance: float) -> Floats:
    return rest_voltages(build_reference(plan, Datasheet(), total_resistance))


def heat(network: Network) -> float:
    """Power that all resistors turn to heat at rest, in W: sum of V^2 / R."""
    resistors = network.resistors
    drop = (
        resistors.free.T @ dc_voltages(network)
        + resistors.held.T @ network.held_voltages()
    )
    return float(np.sum(drop**2 / resistors.value))


def feedthrough_phasor(
    reference: Reference, frequencies: ArrayLike, amplitude: float
) -> NDArray[np.complex128]:
    """Movement of each threshold for a sine at the input, as phasors against that sine, in V: (n, M).

    frequencies (n,) in Hz, amplitude of the input in V.
    """
    drive = {name: part * amplitude for name, part in reference.drive.items()}
    return np.asarray(
        ac_voltages(reference.network, frequencies, drive) @ reference.taps.T
    )


def noise_sigma(reference: Reference) -> Floats:
    """Thermal noise of each threshold in V: (M,); 0 where the tap is held.

    Every resistor's 4 k T R, shaped by the network, adds up to the covariance k T C^-1 of the nodes with a capacitance,
    whatever the resistances and inductances: k T / C at each node, at 300 K.
    Source: equipartition of energy; H. Nyquist, Phys. Rev. 32, 1928 (memory).
    """
    own = reference.network.capacitance.diagonal() > 0
    taps = csc_array(reference.taps[:, own])
    stored = splu(reference.network.capacitance[own][:, own].tocsc())
    square = taps.multiply(csc_array(stored.solve(taps.T.toarray()).T)).sum(axis=1)
    return np.sqrt(Boltzmann * TEMPERATURE * np.asarray(square))


def tap_error_power(
    kickback_lsb: Floats | None,
    feedthrough_lsb: NDArray[np.complex128] | None,
    noise_lsb: Floats | None,
    bits: int,
) -> float:
    """Error power of moving taps under a full-scale sine, in LSB^2; None for an effect that is not there.

    Feedthrough F acts when the input crosses the threshold: there the sine stands at x amplitudes and its quadrature at
    +-sqrt(1 - x^2), so that the mean square over both crossings is (Re F x)^2 + (Im F)^2 (1 - x^2).
    """
    weights, position = sine_weights(bits), sine_positions(bits)
    power = 0.0
    if kickback_lsb is not None:
        power += float(weights @ kickback_lsb**2)
    if feedthrough_lsb is not None:
        square = (feedthrough_lsb.real * position) ** 2 + feedthrough_lsb.imag**2 * (
            1.0 - position**2
        )
        power += float(weights @ square)
    if noise_lsb is not None:
        power += float(weights @ noise_lsb**2)
    return power
