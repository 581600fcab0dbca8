"""The transient bench on one sized cell: every value of its datasheet, with how it was obtained and its interval."""

from dataclasses import dataclass

import numpy as np

from flashplan.cell.bench.aperture import measure_aperture
from flashplan.cell.bench.cycle import Cycle, measure_cycle
from flashplan.cell.bench.memory import measure_memory
from flashplan.cell.bench.noise import measure_noise
from flashplan.cell.bench.offset import offset_distribution
from flashplan.cell.bench.regeneration import measure_regeneration
from flashplan.cell.bench.setup import Setup
from flashplan.cell.linearised import LinearCell
from flashplan.cell.sized import Origin
from flashplan.cell.sizing.model import coupling_capacitance, gate_area

_WAIT = 20.0  # decision times that a 1 uV input is given to regenerate


@dataclass(frozen=True)
class Measured:
    """Datasheet values by name in SI, their origins, the cycle behind some of them, and instances that failed."""

    values: dict[str, float]
    origins: dict[str, Origin]
    cycle: Cycle
    failed: int


def measure_quick(setup: Setup) -> Measured:
    """What corrects the model: regeneration, one clock period, sampling instant and memory."""
    regeneration = measure_regeneration(setup, _WAIT * setup.decision_time)
    cycle = measure_cycle(setup)
    aperture = measure_aperture(setup)
    static = cycle.static_power
    period = setup.decision_time + setup.reset_time
    values = {
        "regeneration_tau": regeneration.tau,
        "regeneration_gain": regeneration.gain,
        "delay": regeneration.delay,
        "skew_sigma": aperture.skew_sigma,
        "hysteresis": measure_memory(setup),
        "kickback_charge": cycle.kickback,
        # Static power flows all the time; the datasheet keeps it apart from what a decision adds.
        "energy": max(cycle.energy - static * period, 0.0),
        "static_power": static,
    }
    origins = {
        "regeneration_tau": Origin(
            "transient: slope of ln(output), 1 uV at the input",
            regeneration.tau_low,
            regeneration.tau_high,
        ),
        "regeneration_gain": Origin(
            "transient: gives the instant of the valid level at 1 uV with this tau and delay"
        ),
        "delay": Origin(
            "transient: clock mid-edge to where the output keeps within 10 % of its exponential"
        ),
        "skew_sigma": Origin(
            "transient: response to a ramp with each device shifted by its sigma; without the clock tree's skew"
        ),
        "hysteresis": Origin(
            "transient: trip points after a 0.1 V decision either way and one reset"
        ),
        "kickback_charge": Origin(
            "transient: half the difference of the reference gate's charge, largest of 5, 20 and 80 mV",
            cycle.kickback_low,
            cycle.kickback,
        ),
        "energy": Origin(
            "transient: supply charge of one period and the clock's gates"
        ),
        "static_power": Origin("transient: supply current at the end of the reset"),
    }
    return Measured(values, origins, cycle, cycle.failed)


def measure_whole(
    setup: Setup,
    quick: Measured,
    linear: LinearCell,
    pair_tail: str,
    draws: int,
    seed: int,
) -> Measured:
    """The whole datasheet: adds offset by bisection of `draws`, noise of as many decisions times five, capacitances, area.

    seed: of the mismatch draws and the noise, each its own stream.
    """
    streams = np.random.SeedSequence(seed).spawn(2)
    noise = measure_noise(
        setup,
        float(linear.noise_sigma[0]),
        5 * draws,
        np.random.default_rng(streams[1]),
    )
    generator = np.random.default_rng(streams[0])
    predicted = float(linear.offset_sigma[0])
    offsets = offset_distribution(setup, draws, generator, predicted)
    row = setup.network.circuit.nodes.index("minus")
    values = {
        "offset_sigma": _confirmed(predicted, offsets.sigma, offsets.low, offsets.high),
        "noise_sigma": _confirmed(
            float(linear.noise_sigma[0]), noise.sigma, noise.low, noise.high
        ),
        **quick.values,
        "input_capacitance": float(setup.network.capacitance[row, row]),
        "coupling_capacitance": coupling_capacitance(setup, pair_tail),
        "area": gate_area(setup),
    }
    origins = {
        "offset_sigma": Origin(
            f"linear analysis of the decision ({predicted * 1e3:.4g} mV), kept where it lies in the 95 % interval of"
            f" {offsets.offsets.size} mismatch draws bisected in the transient ({offsets.sigma * 1e3:.4g} mV)",
            offsets.low,
            offsets.high,
        ),
        "noise_sigma": Origin(
            f"linear analysis of the decision ({float(linear.noise_sigma[0]) * 1e3:.4g} mV), kept where it lies in the"
            f" 95 % interval of {noise.decisions} stochastic decisions ({noise.sigma * 1e3:.4g} mV)",
            noise.low,
            noise.high,
        ),
        **quick.origins,
        "input_capacitance": Origin("gate capacitance: 2/3 W L C_ox and both overlaps"),
        "coupling_capacitance": Origin(
            "capacitances of the pair in series through its tail"
        ),
        "area": Origin("sum of gate areas; a layout takes several times that"),
    }
    failed = quick.failed + offsets.failed + offsets.unbracketed + noise.failed
    return Measured(values, origins, quick.cycle, failed)


def _confirmed(predicted: float, measured: float, low: float, high: float) -> float:
    """A prediction that the measurement's interval contains; the measurement itself otherwise."""
    return predicted if low <= predicted <= high else measured
