"""A linear network: parts on a graph, turned into sparse matrices of its free nodes."""

from dataclasses import dataclass
from typing import Literal

import networkx as nx
import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array, csc_array
from scipy.sparse.linalg import splu

from flashplan.errors import InputError

Floats = NDArray[np.float64]
Kind = Literal["resistor", "capacitor", "voltage", "current"]
GROUND = "ground"


@dataclass(frozen=True)
class Part:
    """One part between two nodes: ohm, F, V (first against second) or A (drawn out of the first into the second)."""

    kind: Kind
    first: str
    second: str
    value: float
    label: str


@dataclass(frozen=True)
class Network:
    """Matrices of the free nodes, those that no voltage source holds; f free nodes, h held ones.

    names: of the free nodes in order. conductance, capacitance: (f, f). held: name of each held node and its voltage.
    conductance_to, capacitance_to: (f, h) between free and held nodes. drawn: (f,) current drawn out of each node.
    """

    names: tuple[str, ...]
    held: dict[str, float]
    conductance: csc_array
    capacitance: csc_array
    conductance_to: csc_array
    capacitance_to: csc_array
    drawn: Floats

    def held_voltages(self) -> Floats:
        """Voltages of the held nodes in their order, (h,)."""
        return np.array(list(self.held.values()))


def build_network(parts: list[Part]) -> Network:
    """Assemble parts into matrices.

    Voltage sources must stand between a node and ground. Raises InputError that names the part for a value that is
    not positive, two sources on one node, and a node that no resistor ties to a source or to ground.
    Source: nodal analysis; any textbook on networks.
    """
    graph: nx.MultiGraph[str] = nx.MultiGraph()
    graph.add_node(GROUND)
    held = {GROUND: 0.0}
    for part in parts:
        if part.kind in ("resistor", "capacitor") and not part.value > 0:
            raise InputError(f"{part.label} must be positive, found {part.value:g}")
        if part.kind == "voltage":
            if part.second != GROUND:
                raise InputError(f"{part.label} must be a source against {GROUND}")
            if part.first in held:
                raise InputError(
                    f"{part.label} holds a node that another source holds already"
                )
            held[part.first] = part.value
        graph.add_edge(part.first, part.second, part=part)
    _refuse_floating(graph, held)
    names = tuple(node for node in graph if node not in held)
    free = {name: index for index, name in enumerate(names)}
    fixed = {name: index for index, name in enumerate(held)}
    conductance, conductance_to = _stamp(
        [part for part in parts if part.kind == "resistor"], free, fixed
    )
    capacitance, capacitance_to = _stamp(
        [part for part in parts if part.kind == "capacitor"], free, fixed
    )
    drawn = np.zeros(len(names))
    for part in parts:
        if part.kind == "current":
            if part.first in free:
                drawn[free[part.first]] += part.value
            if part.second in free:
                drawn[free[part.second]] -= part.value
    return Network(
        names, held, conductance, capacitance, conductance_to, capacitance_to, drawn
    )


def _stamp(
    parts: list[Part], free: dict[str, int], fixed: dict[str, int]
) -> tuple[csc_array, csc_array]:
    own: list[tuple[int, int, float]] = []
    other: list[tuple[int, int, float]] = []
    for part in parts:
        value = 1.0 / part.value if part.kind == "resistor" else part.value
        for here, there in ((part.first, part.second), (part.second, part.first)):
            if here not in free:
                continue
            own.append((free[here], free[here], value))
            if there in free:
                own.append((free[here], free[there], -value))
            else:
                other.append((free[here], fixed[there], value))
    return _sparse(own, (len(free), len(free))), _sparse(other, (len(free), len(fixed)))


def _sparse(entries: list[tuple[int, int, float]], shape: tuple[int, int]) -> csc_array:
    rows, columns, values = np.array(entries).T if entries else np.zeros((3, 0))
    return coo_array(
        (values, (rows.astype(int), columns.astype(int))), shape=shape
    ).tocsc()


def _refuse_floating(graph: "nx.MultiGraph[str]", held: dict[str, float]) -> None:
    resistive: nx.Graph[str] = nx.Graph()
    resistive.add_nodes_from(graph)
    resistive.add_edges_from(
        (a, b) for a, b, part in _edges(graph) if part.kind == "resistor"
    )
    tied = {
        node
        for component in nx.connected_components(resistive)
        if component & set(held)
        for node in component
    }
    for node in graph:
        if node not in tied:
            labels = ", ".join(
                sorted({part.label for a, b, part in _edges(graph) if node in (a, b)})
            )
            raise InputError(
                f"node {node} floats: no resistor ties it to a source; it hangs on {labels}"
            )


def _edges(graph: "nx.MultiGraph[str]") -> list[tuple[str, str, Part]]:
    return list(graph.edges(data="part"))


def dc_voltages(network: Network) -> Floats:
    """Voltages of the free nodes at rest, (f,)."""
    return np.asarray(
        splu(network.conductance).solve(
            network.conductance_to @ network.held_voltages() - network.drawn
        )
    )


def ac_voltages(
    network: Network, frequency: float, drive: dict[str, complex]
) -> NDArray[np.complex128]:
    """Phasors of the free nodes for phasors on some held nodes, (f,); all other held nodes stand still.

    frequency in Hz. Source: complex admittances G + j 2 pi f C.
    """
    turn = 2j * np.pi * frequency
    phasor = np.array([drive.get(name, 0.0) for name in network.held], dtype=complex)
    admittance = (network.conductance + turn * network.capacitance).tocsc()
    return np.asarray(
        splu(admittance).solve(
            network.conductance_to @ phasor + turn * (network.capacitance_to @ phasor)
        )
    )
