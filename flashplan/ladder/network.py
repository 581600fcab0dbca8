"""A linear network: parts on a graph, turned into sparse matrices of its free nodes; at rest and at a frequency."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal, NamedTuple

import networkx as nx
import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.sparse import (
    block_diag,
    coo_array,
    csc_array,
    diags_array,
    hstack,
    vstack,
)
from scipy.sparse.linalg import splu

from flashplan.errors import InputError

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
Kind = Literal["resistor", "capacitor", "inductor", "voltage", "current"]
GROUND = "ground"


class Part(NamedTuple):
    """One part between two nodes: ohm, F, H, V (first against second) or A (drawn out of the first into the second).

    sigma: relative spread of the value of one part to the next.
    """

    kind: Kind
    first: str
    second: str
    value: float
    label: str
    sigma: float = 0.0


@dataclass(frozen=True)
class Branches:
    """All b parts of a kind: value and sigma (b,), and where they hang: +1 at the first node, -1 at the second.

    free: (f, b) on the free nodes; held: (h, b) on the held ones.
    """

    value: Floats
    sigma: Floats
    free: csc_array
    held: csc_array


@dataclass(frozen=True)
class Network:
    """f free nodes and h held by voltage sources, ground among them, with l inductors.

    names: of the free nodes in order. held: name of each held node and its voltage. conductance, capacitance: (f, f).
    conductance_to, capacitance_to: (f, h) what ties free to held nodes, positive. drawn: (f,) current drawn out of each.
    """

    names: tuple[str, ...]
    held: dict[str, float]
    resistors: Branches
    inductors: Branches
    conductance: csc_array
    capacitance: csc_array
    conductance_to: csc_array
    capacitance_to: csc_array
    drawn: Floats

    def held_voltages(self) -> Floats:
        """Voltages of the held nodes in their order, (h,)."""
        return np.array(list(self.held.values()))


def build_network(parts: Sequence[Part]) -> Network:
    """Assemble parts into matrices.

    Raises InputError that names the part for a value that is not positive, a loop of voltage sources, or of sources and
    inductors, that leaves a current undetermined, a source with no path of sources to ground, and a node that floats.
    Source: nodal analysis with branch currents; any textbook on networks.
    """
    graph = _graph(parts)
    held = _held_nodes(graph, parts)
    _refuse_undetermined(graph, parts, held)
    names = tuple(node for node in graph if node not in held)
    free = {name: index for index, name in enumerate(names)}
    fixed = {name: index for index, name in enumerate(held)}
    by_kind: dict[Kind, Branches] = {
        kind: _branches([part for part in parts if part.kind == kind], free, fixed)
        for kind in ("resistor", "capacitor", "inductor", "current")
    }
    conductance, conductance_to = _stamp(
        by_kind["resistor"], 1.0 / by_kind["resistor"].value
    )
    capacitance, capacitance_to = _stamp(
        by_kind["capacitor"], by_kind["capacitor"].value
    )
    return Network(
        names,
        held,
        by_kind["resistor"],
        by_kind["inductor"],
        conductance,
        capacitance,
        conductance_to,
        capacitance_to,
        by_kind["current"].free @ by_kind["current"].value,
    )


def _branches(
    parts: list[Part], free: Mapping[str, int], fixed: Mapping[str, int]
) -> Branches:
    def incidence(place: Mapping[str, int]) -> csc_array:
        first = [place.get(part.first, -1) for part in parts]
        second = [place.get(part.second, -1) for part in parts]
        rows = np.array([*first, *second], dtype=int)
        columns = np.tile(np.arange(len(parts)), 2)
        signs = np.repeat([1.0, -1.0], len(parts))
        there = rows >= 0
        return coo_array(
            (signs[there], (rows[there], columns[there])),
            shape=(len(place), len(parts)),
        ).tocsc()

    return Branches(
        np.array([part.value for part in parts]),
        np.array([part.sigma for part in parts]),
        incidence(free),
        incidence(fixed),
    )


def _stamp(branches: Branches, weight: Floats) -> tuple[csc_array, csc_array]:
    weighted = branches.free @ diags_array(weight)
    return csc_array(weighted @ branches.free.T), csc_array(-weighted @ branches.held.T)


def _graph(parts: Sequence[Part]) -> "nx.MultiGraph[str]":
    graph: nx.MultiGraph[str] = nx.MultiGraph()
    graph.add_node(GROUND)
    for part in parts:
        if not np.isfinite(part.value):
            raise InputError(f"{part.label} must be finite, found {part.value:g}")
        if part.kind in ("resistor", "capacitor", "inductor") and not part.value > 0:
            raise InputError(f"{part.label} must be positive, found {part.value:g}")
        graph.add_edge(part.first, part.second, part=part)
    return graph


def _held_nodes(graph: "nx.MultiGraph[str]", parts: Sequence[Part]) -> dict[str, float]:
    """Voltage of each node that sources tie to ground."""
    sources: nx.Graph[str] = nx.Graph()
    sources.add_node(GROUND)
    joined = nx.utils.UnionFind(graph)
    for part in parts:
        if part.kind == "voltage":
            if joined[part.first] == joined[part.second]:
                raise InputError(f"{part.label} closes a loop of voltage sources")
            joined.union(part.first, part.second)
            sources.add_edge(part.first, part.second, part=part)
    held = {GROUND: 0.0}
    for known, found in nx.bfs_edges(sources, GROUND):
        part = sources.edges[known, found]["part"]
        held[found] = held[known] + (part.value if part.first == found else -part.value)
    for first, second, part in sources.edges(data="part"):
        if first not in held:
            raise InputError(
                f"{part.label} between {first} and {second} is not tied to {GROUND} by sources"
            )
    return held


def _refuse_undetermined(
    graph: "nx.MultiGraph[str]", parts: Sequence[Part], held: Mapping[str, float]
) -> None:
    shorted = nx.utils.UnionFind(graph)
    shorted.union(*held)
    tied = nx.utils.UnionFind(graph)
    tied.union(*held)
    soft: set[str] = set()
    for part in parts:
        if part.kind == "inductor":
            if shorted[part.first] == shorted[part.second]:
                raise InputError(
                    f"{part.label} closes a loop of inductors and voltage sources"
                )
            shorted.union(part.first, part.second)
        if part.kind in ("resistor", "inductor"):
            tied.union(part.first, part.second)
        if part.kind in ("resistor", "capacitor"):
            soft.update((part.first, part.second))
    ground = tied[GROUND]
    for node in graph:
        if tied[node] != ground:
            raise InputError(
                f"node {node} floats: nothing that carries direct current ties it to a source;"
                f" it hangs on {_labels(graph, node)}"
            )
        if node not in held and node not in soft:
            raise InputError(
                f"node {node} has neither a resistor nor a capacitor; it hangs on {_labels(graph, node)}"
            )


def _labels(graph: "nx.MultiGraph[str]", node: str) -> str:
    parts: list[tuple[str, str, Part]] = list(graph.edges(node, data="part"))
    return ", ".join(sorted({part.label for _, _, part in parts}))


def with_resistances(network: Network, value: ArrayLike) -> Network:
    """The same network with other values of its resistors, (r,) in the order of their parts."""
    changed = replace(network.resistors, value=np.asarray(value, dtype=np.float64))
    own, to = _stamp(changed, 1.0 / changed.value)
    return replace(network, resistors=changed, conductance=own, conductance_to=to)


def loss_matrix(network: Network) -> csc_array:
    """(f + l, f + l) of free voltages and inductor currents: conductances, and each inductor's current out of its nodes."""
    coil = network.inductors.free
    above = hstack([network.conductance, coil])
    below = hstack([-coil.T, csc_array((coil.shape[1], coil.shape[1]))])
    return csc_array(vstack([above, below]))


def storage_matrix(network: Network) -> csc_array:
    """(f + l, f + l): capacitances and inductances."""
    inductance = diags_array(network.inductors.value)
    return csc_array(block_diag([network.capacitance, inductance]))


def dc_voltages(network: Network) -> Floats:
    """Voltages of the free nodes at rest, (f,)."""
    held = network.held_voltages()
    source = np.concatenate(
        [
            network.conductance_to @ held - network.drawn,
            network.inductors.held.T @ held,
        ]
    )
    return np.asarray(splu(loss_matrix(network)).solve(source))[: len(network.names)]


def ac_voltages(
    network: Network, frequencies: ArrayLike, drive: Mapping[str, complex]
) -> Complexes:
    """Phasors of the free nodes, (n, f), at n frequencies in Hz for phasors on some held nodes; the others stand still.

    Source: complex admittances, (A + j 2 pi f E) x = source.
    """
    phasor = np.array([drive.get(name, 0.0) for name in network.held], dtype=complex)
    loss, storage = loss_matrix(network), storage_matrix(network)
    coil = network.inductors.held.T @ phasor
    out = []
    for frequency in np.atleast_1d(np.asarray(frequencies, dtype=np.float64)):
        turn = 2j * np.pi * frequency
        node = network.conductance_to @ phasor + turn * (
            network.capacitance_to @ phasor
        )
        solved = splu((loss + turn * storage).tocsc()).solve(
            np.concatenate([node, coil])
        )
        out.append(solved[: len(network.names)])
    return np.array(out)
