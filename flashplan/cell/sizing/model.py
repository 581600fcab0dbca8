"""The cell's datasheet as a smooth function of its sizes: what the optimiser works on."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.bench.cycle import clock_rows
from flashplan.cell.bench.setup import Setup
from flashplan.cell.circuit import device_currents
from flashplan.cell.device import drain_current
from flashplan.cell.linearised import LinearCell, linearise
from flashplan.cell.sizing.clocked import Topology, setup_of
from flashplan.cell.sizing.conditions import Conditions

Floats = NDArray[np.float64]

RESETS = 10.0  # time constants that a node is given to forget a decision
_HEADROOM = 0.3  # part of the supply that the preamplifier's loads may drop at balance


@dataclass(frozen=True)
class ModelValues:
    """Of several sizings, each (sizings,) in SI: what is limited, by name; energy per decision J; area m2."""

    limited: dict[str, Floats]
    gain: Floats
    energy: Floats
    area: Floats
    linear: LinearCell


def evaluate(
    topology: Topology, conditions: Conditions, points: list[Floats]
) -> ModelValues:
    """Model of the cell at several sets of sizes at once.

    Offset, noise, tau, gain and delay come from the linearised decision. Closed forms give the rest to a factor that
    the bench corrects: skew (the tail's threshold over the clock's slope, plus its current on the integration time),
    kickback (gate charge of one input device times a quarter of the swing), energy (C V^2 of what the clock moves).
    "reset" and "headroom" are ratios that must stay below 1.
    """
    setups = [setup_of(topology, conditions, x) for x in points]
    linear = linearise(setups)
    limited = {
        "offset_sigma": linear.offset_sigma,
        "noise_sigma": linear.noise_sigma,
        "regeneration_tau": np.where(linear.tau > 0, linear.tau, 1e-6),
        "delay": np.maximum(linear.delay, 1e-13),
        "skew_sigma": np.array(
            [_skew(s, linear.instant[k]) for k, s in enumerate(setups)]
        ),
        "kickback_charge": np.array([_kickback(s, topology) for s in setups]),
        "input_capacitance": np.array([_input(s) for s in setups]),
        "reset": np.array([_reset(s, conditions) for s in setups]),
    }
    if topology.static:
        limited["headroom"] = np.array([_drop(s) for s in setups])
    return ModelValues(
        limited=limited,
        gain=linear.gain,
        energy=np.array([_energy(s, topology, conditions) for s in setups]),
        area=np.array([gate_area(s) for s in setups]),
        linear=linear,
    )


def gate_area(setup: Setup) -> float:
    """Area of all gates, m2; a layout takes several times that."""
    return float(setup.network.area.sum())


def _input(setup: Setup) -> float:
    row = setup.network.circuit.nodes.index("minus")
    return float(setup.network.capacitance[row, row])


def _skew(setup: Setup, instant: float) -> float:
    network = setup.network
    names = [device.name for device in network.circuit.devices]
    sigma = float(network.threshold_sigma[names.index("tail")])
    slope = setup.edge / network.supply
    overdrive = max(0.1, network.supply - network.parameters.threshold[0, 0])
    integration = max(float(instant) + setup.edge / 2.0, 0.0)
    return (slope + integration / overdrive) * sigma


def _kickback(setup: Setup, topology: Topology) -> float:
    swing = _swing(setup, topology)
    return 0.25 * swing * _input(setup)


def _swing(setup: Setup, topology: Topology) -> float:
    """How far the drains of the input pair move in a decision, V."""
    if not topology.static:
        return setup.network.supply
    return 2.0 * _HEADROOM * setup.network.supply * _drop(setup)


def _energy(setup: Setup, topology: Topology, conditions: Conditions) -> float:
    network = setup.network
    free = len(network.circuit.free)
    own = np.diag(network.capacitance)
    moved = 0.6 * own[:free].sum() + own[clock_rows(network)].sum()
    dynamic = float(moved) * network.supply**2
    if not topology.static:
        return dynamic
    return dynamic + _bias(setup) * network.supply * conditions.period


def _reset(setup: Setup, conditions: Conditions) -> float:
    """Time that the slowest reset node takes to forget, over the time it has."""
    network = setup.network
    devices = network.circuit.devices
    nodes = network.circuit.nodes
    probe = 0.02
    one = np.full((len(devices), 1), network.supply)
    on = drain_current(network.parameters, one, np.full_like(one, probe), 0.0 * one)
    worst = 0.0
    for k, device in enumerate(devices):
        if device.name.startswith(("reset", "transfer")):
            row = nodes.index(device.drain)
            worst = max(worst, network.capacitance[row, row] * probe / float(on[k, 0]))
    if network.circuit.resistors:  # the preamplifier forgets through its loads
        row = nodes.index("p_a")
        load = network.circuit.resistors[0].value
        worst = max(worst, load * float(network.capacitance[row, row]))
    return RESETS * worst / max(conditions.reset_time - conditions.edge, 1e-15)


def _bias(setup: Setup) -> float:
    """Current of the preamplifier's tail, A."""
    network = setup.network
    levels = {
        "supply": network.supply,
        "bias": setup.bias,
        "pair": max(0.1, setup.common_mode - network.parameters.threshold[1, 0] - 0.1),
    }
    full = np.array([[levels.get(name, 0.0)] for name in network.circuit.nodes])
    return float(device_currents(network, network.parameters, full)[0, 0])


def _drop(setup: Setup) -> float:
    """Drop of the preamplifier's loads at balance over what is allowed."""
    resistance = setup.network.circuit.resistors[0].value
    return 0.5 * _bias(setup) * resistance / (_HEADROOM * setup.network.supply)


def coupling_capacitance(setup: Setup, tail: str) -> float:
    """Capacitance from one input to the other through the pair's floating tail, F: C_gs^2 / (2 C_gs + C_tail)."""
    network = setup.network
    nodes = network.circuit.nodes
    plus, minus, middle = nodes.index("plus"), nodes.index("minus"), nodes.index(tail)
    c = network.capacitance
    through = -float(c[plus, middle]) * -float(c[minus, middle])
    return max(0.0, through / float(c[middle, middle]) - float(c[plus, minus]))


def tau_at_gain(
    tau: Floats, gain: Floats, plan_gain: float, level: float, lsb: float, rate: float
) -> Floats:
    """The tau that would do with the plan's assumed gain what this tau does with its own gain, s.

    Both leave 2 V / (A LSB) exp(-t / tau) of the decisions undecided, so that tau counts by ln(2 V / (A LSB rate)).
    level: valid level V; lsb in V; rate: undecided decisions allowed.
    """
    own = np.log(np.maximum(2.0 * level / (gain * lsb * rate), 1.0 + 1e-9))
    assumed = math.log(max(2.0 * level / (plan_gain * lsb * rate), 1.0 + 1e-9))
    return tau * own / assumed
