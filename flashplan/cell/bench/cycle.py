"""One whole clock period: energy by device, static power, kickback into the inputs."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.bench.setup import Setup, clock_drive, reset_state, run
from flashplan.cell.circuit import (
    Network,
    device_currents,
    device_voltages,
    with_driven,
)
from flashplan.cell.device import channel_state, mean_charge

Floats = NDArray[np.float64]

_OVERDRIVES = (5e-3, 20e-3, 80e-3)  # V


@dataclass(frozen=True)
class Cycle:
    """Energy per decision J, of which the clock's own; share of each device J (devices,); static power W in reset.

    kickback: differential charge in C pushed into the reference input, the largest of several overdrives, and the
    least of them; common_kickback: the part that does not depend on the decision, which moves all taps alike.
    """

    energy: float
    clock_energy: float
    device_energy: Floats
    static_power: float
    kickback: float
    kickback_low: float
    common_kickback: float
    failed: int

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON types."""
        return {
            "energy": self.energy,
            "clock_energy": self.clock_energy,
            "device_energy": self.device_energy.tolist(),
            "static_power": self.static_power,
            "kickback_charge": self.kickback,
            "kickback_charge_low": self.kickback_low,
            "common_kickback_charge": self.common_kickback,
            "failed": self.failed,
        }


def measure_cycle(setup: Setup) -> Cycle:
    """Run one period (decision, then reset) at plus and minus several overdrives and account for its charges.

    Energy: supply times the charge drawn from it over the period, plus C_clock supply^2 for the gates that the clock
    drives; the mean over the overdrives. Kickback: half the difference of the reference gate's charge between the two
    decisions, at its largest during the decision, channel and overlap charge included.
    """
    network = setup.network
    difference = np.array([s * v for v in _OVERDRIVES for s in (1.0, -1.0)])
    start = np.repeat(reset_state(setup, network.parameters, 1), difference.size, 1)
    high = setup.decision_time + setup.edge / 2.0
    drive, breaks = clock_drive(setup, difference, 0.0, high)
    path = run(
        setup, network.parameters, drive, start, (0.0, high + setup.reset_time), breaks
    )
    supply_row = network.leaving[network.circuit.nodes.index("supply")]
    drawn, burnt, gates = [], [], []
    reference = gate_devices(network, "minus")
    for time, free in zip(path.time, path.voltages, strict=True):
        full = with_driven(free, drive(time)[0])
        current = device_currents(network, network.parameters, full)
        resistive = (network.conductance @ full)[network.circuit.nodes.index("supply")]
        drawn.append(supply_row @ current + resistive)
        _, drain, source = device_voltages(network, full)
        burnt.append(current * (drain - source))
        gates.append(gate_charge(network, full, reference))
    time = path.time
    static = setup.network.supply * float(np.mean(drawn[0]))
    energy = network.supply * np.trapezoid(np.array(drawn), time, axis=0)
    clock = sum(
        network.capacitance[k, k] * network.supply**2 for k in clock_rows(network)
    )
    charge = np.array(gates)
    within = time <= high
    moved = charge[within] - charge[0]
    half = np.abs(moved[:, 0::2] - moved[:, 1::2]).max(axis=0) / 2.0
    common = np.abs(moved[:, 0::2] + moved[:, 1::2]).max() / 2.0
    return Cycle(
        energy=float(energy.mean() + clock),
        clock_energy=float(clock),
        device_energy=np.trapezoid(np.array(burnt), time, axis=0).mean(axis=1),
        static_power=static,
        kickback=float(half.max()),
        kickback_low=float(half.min()),
        common_kickback=float(common),
        failed=int(path.failed.sum()),
    )


def clock_rows(network: Network) -> list[int]:
    """Rows of the clock phases among all nodes."""
    return [
        k for k, name in enumerate(network.circuit.nodes) if name.startswith("clock")
    ]


def gate_devices(network: Network, node: str) -> NDArray[np.intp]:
    """Devices whose gate is a node."""
    return np.flatnonzero(network.gate == network.circuit.nodes.index(node))


def gate_charge(
    network: Network, voltages: Floats, devices: NDArray[np.intp]
) -> Floats:
    """Charge on the gates of some devices, channel and both overlaps, summed: (instances,), C."""
    p = network.parameters
    gate, drain, source = device_voltages(network, voltages)
    state = channel_state(p, gate, drain, source)
    total = p.gate_charge * mean_charge(state) + network.overlap[:, None] * (
        2.0 * gate - drain - source
    )
    picked: Floats = (network.sign * total)[devices].sum(axis=0)
    return picked
