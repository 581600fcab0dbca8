"""The clocked topologies as functions of a few free sizes."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.bench.setup import Setup
from flashplan.cell.circuit import Circuit, build_network
from flashplan.cell.sizing.conditions import Conditions
from flashplan.cell.topology import double_tail, latch, preamp_latch, single_tail
from flashplan.cell.topology.sizes import Size, Sizes
from flashplan.errors import InputError

Floats = NDArray[np.float64]

_WIDEST = 3000.0  # minimum widths
_BIAS_OVERDRIVE = 0.15  # V above threshold of the preamplifier's tail
_START = {  # minimum widths from which the search sets out
    "tail": 12.0,
    "input": 20.0,
    "reset": 4.0,
    "second_tail": 24.0,
    "transfer": 8.0,
    "latch_n": 8.0,
    "latch_p": 12.0,
    "bias": 10.0,
    "preamp": 20.0,
}


@dataclass(frozen=True)
class Topology:
    """groups: devices sized alike; pair: the group at the cell's input; static: it has a preamplifier with loads."""

    name: str
    groups: tuple[str, ...]
    pair: str
    static: bool = False


CLOCKED = {
    topology.name: topology
    for topology in (
        Topology(single_tail.NAME, latch.GROUPS, "input"),
        Topology(double_tail.NAME, double_tail.GROUPS, "input"),
        Topology(preamp_latch.NAME, preamp_latch.GROUPS, "preamp", static=True),
    )
}


def variables(topology: Topology) -> tuple[str, ...]:
    """Names of what is sized: one width by group, and the load resistance where there is one."""
    return (*topology.groups, *(("resistance",) if topology.static else ()))


def first_guess(topology: Topology, conditions: Conditions) -> Floats:
    """Logarithms of the sizes that the search sets out from."""
    narrow = conditions.process.minimum_width
    values = [_START[group] * narrow for group in topology.groups]
    if topology.static:
        values.append(0.3 * conditions.supply / _bias_current(values[0], conditions))
    return np.log(values)


def bounds(topology: Topology, conditions: Conditions) -> list[tuple[float, float]]:
    """Least and largest logarithm of each size."""
    narrow = math.log(conditions.process.minimum_width)
    found = [(narrow, narrow + math.log(_WIDEST))] * len(topology.groups)
    if topology.static:
        found.append((math.log(10.0), math.log(1e6)))
    return found


def sizes_of(topology: Topology, conditions: Conditions, x: Floats) -> Sizes:
    """Sizes by group from the logarithms; all lengths are the process's shortest."""
    return {
        group: Size(math.exp(value), conditions.process.minimum_length)
        for group, value in zip(topology.groups, x, strict=False)
    }


def setup_of(topology: Topology, conditions: Conditions, x: Floats) -> Setup:
    """The bench setup of a cell with these sizes."""
    sizes = sizes_of(topology, conditions, x)
    circuit = _circuit(topology, conditions, sizes, x)
    network = build_network(circuit, conditions.process, conditions.supply)
    lead = 0.0
    if topology.static:
        row = circuit.nodes.index("p_a")
        settle = 6.0 * math.exp(x[-1]) * float(network.capacitance[row, row])
        lead = min(settle, conditions.reset_time)
    return Setup(
        network=network,
        common_mode=conditions.common_mode,
        edge=conditions.edge,
        decision_time=conditions.decision_time,
        reset_time=conditions.reset_time,
        bias=conditions.process.nmos.threshold + _BIAS_OVERDRIVE,
        lead=lead,
    )


def require_supply(topology: Topology, conditions: Conditions) -> None:
    """Raise InputError when the topology cannot work at the supply: devices stacked between the rails must turn on."""
    nmos, pmos = conditions.process.nmos, conditions.process.pmos
    least = nmos.threshold + pmos.threshold + 0.1
    if topology.static:
        least += _BIAS_OVERDRIVE
    if conditions.supply < least:
        raise InputError(
            f"{topology.name} needs a supply of at least {least:.2f} V in {conditions.process.name};"
            f" the plan has {conditions.supply:g} V",
            "converter.supply",
        )


def _circuit(
    topology: Topology, conditions: Conditions, sizes: Sizes, x: Floats
) -> Circuit:
    if topology.name == single_tail.NAME:
        return single_tail.single_tail(sizes, conditions.load)
    if topology.name == double_tail.NAME:
        return double_tail.double_tail(sizes, conditions.load)
    return preamp_latch.preamp_latch(sizes, conditions.load, math.exp(x[-1]))


def _bias_current(width: float, conditions: Conditions) -> float:
    """Rough current of the preamplifier's tail, A: the square law at its overdrive."""
    nmos = conditions.process.nmos
    ratio = width / conditions.process.minimum_length
    return 0.5 * nmos.mobility_factor * ratio * _BIAS_OVERDRIVE**2 / nmos.slope_factor
