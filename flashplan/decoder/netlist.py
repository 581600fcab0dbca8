"""A decoder as a directed graph of simple gates, evaluated for 64 words at once."""

from collections import Counter
from dataclasses import dataclass
from functools import reduce
from typing import Literal

import networkx as nx
import numpy as np
from numpy.typing import NDArray

Kind = Literal["and", "and-not", "or", "wired-or", "xor", "majority", "mux"]
Lanes = NDArray[np.uint64]

# Transistors of a static CMOS gate with two inputs, three for majority, mux and the three-input ones; common practice.
_TRANSISTORS = {"and": 6, "and-not": 8, "or": 6, "xor": 10, "majority": 12, "mux": 12}


@dataclass(frozen=True)
class Netlist:
    """graph: nodes are inputs ("t1" ..) and gates, with `kind` and ordered `inputs`; edges run from driver to reader.

    outputs: nodes of the word's bits, the lowest first.
    """

    graph: "nx.DiGraph[str]"
    inputs: tuple[str, ...]
    outputs: tuple[str, ...]


class Builder:
    """Puts gates on a graph; hands out their names."""

    def __init__(self, bits: int) -> None:
        self.inputs = tuple(f"t{k}" for k in range(1, 2**bits))
        self._graph: nx.DiGraph[str] = nx.DiGraph()
        self._graph.add_nodes_from(self.inputs, kind="input", inputs=())

    def gate(self, kind: Kind, *inputs: str) -> str:
        """Add a gate that reads the named nodes in this order; a mux reads select, then what it gives for 0 and for 1."""
        name = f"g{self._graph.number_of_nodes() - len(self.inputs) + 1}"
        self._graph.add_node(name, kind=kind, inputs=inputs)
        self._graph.add_edges_from((node, name) for node in inputs)
        return name

    def any_of(self, nodes: list[str]) -> str:
        """OR of nodes through a balanced tree of two-input gates."""
        while len(nodes) > 1:
            paired = [
                self.gate("or", a, b)
                for a, b in zip(nodes[::2], nodes[1::2], strict=False)
            ]
            nodes = paired + nodes[len(nodes) - len(nodes) % 2 :]
        return nodes[0]

    def finish(self, outputs: list[str]) -> Netlist:
        """The netlist with these outputs, lowest bit first."""
        return Netlist(self._graph, self.inputs, tuple(outputs))


def gate_counts(netlist: Netlist) -> Counter[str]:
    """Number of gates of each kind."""
    kinds: list[str] = [netlist.graph.nodes[node]["kind"] for node in netlist.graph]
    return Counter(kind for kind in kinds if kind != "input")


def depth(netlist: Netlist) -> int:
    """Gates on the longest way from an input to an output, by networkx's longest path in a directed acyclic graph."""
    return int(nx.dag_longest_path_length(netlist.graph, default_weight=1))


def transistors(netlist: Netlist) -> int:
    """Estimate of the transistor count: static CMOS gates, one transistor for each cell of a wired OR."""
    total = 0
    for _, data in netlist.graph.nodes(data=True):
        if data["kind"] == "wired-or":
            total += len(data["inputs"]) + 2
        elif data["kind"] != "input":
            total += _TRANSISTORS[data["kind"]] + 2 * max(
                0,
                len(data["inputs"]) - (3 if data["kind"] in ("mux", "majority") else 2),
            )
    return total


def evaluate(netlist: Netlist, words: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Codes that the gates make of thermometer words (n, M): (n,)."""
    lanes = pack(words)
    values = dict(zip(netlist.inputs, lanes, strict=True))
    return _run(netlist, values, words.shape[0])


def evaluate_readings(
    netlist: Netlist,
    word: NDArray[np.bool_],
    undecided: int,
    readings: NDArray[np.bool_],
) -> NDArray[np.int64]:
    """Codes when each gate that reads one undecided input may see its own level.

    word: (M,); undecided: index of the input; readings: (n, readers) level seen by each reader, in `readers` order.
    """
    count = readings.shape[0]
    values = dict(zip(netlist.inputs, pack(np.tile(word, (count, 1))), strict=True))
    seen = dict(zip(readers(netlist, undecided), pack(readings), strict=True))
    return _run(netlist, values, count, (netlist.inputs[undecided], seen))


def readers(netlist: Netlist, index: int) -> list[str]:
    """Gates that read an input; the word's own bit counts as one where the input is itself an output."""
    name = netlist.inputs[index]
    return [
        *netlist.graph.successors(name),
        *(["output"] if name in netlist.outputs else []),
    ]


def pack(words: NDArray[np.bool_]) -> Lanes:
    """Columns of words (n, M) as bit lanes (M, n / 64 rounded up)."""
    count, columns = words.shape
    lanes = np.zeros((columns, -(-count // 64) * 8), dtype=np.uint8)
    bits = np.packbits(words.T, axis=1)
    lanes[:, : bits.shape[1]] = bits
    return lanes.view(np.uint64)


def _run(
    netlist: Netlist,
    values: dict[str, Lanes],
    count: int,
    doubtful: tuple[str, dict[str, Lanes]] | None = None,
) -> NDArray[np.int64]:
    for name in nx.topological_sort(netlist.graph):
        data = netlist.graph.nodes[name]
        if data["kind"] == "input":
            continue
        read = [
            doubtful[1][name]
            if doubtful is not None and node == doubtful[0]
            else values[node]
            for node in data["inputs"]
        ]
        values[name] = _gate(data["kind"], read)
    codes = np.zeros(count, dtype=np.int64)
    for bit, name in enumerate(netlist.outputs):
        lane = (
            doubtful[1]["output"]
            if doubtful is not None and name == doubtful[0]
            else values[name]
        )
        codes |= np.unpackbits(lane.view(np.uint8), count=count).astype(np.int64) << bit
    return codes


def _gate(kind: Kind, read: list[Lanes]) -> Lanes:
    if kind == "and":
        return reduce(np.bitwise_and, read)
    if kind == "and-not":  # all but the last, and not the last
        return reduce(np.bitwise_and, read[:-1]) & ~read[-1]
    if kind in ("or", "wired-or"):
        return reduce(np.bitwise_or, read)
    if kind == "xor":
        return reduce(np.bitwise_xor, read)
    if kind == "majority":
        a, b, c = read
        return (a & b) | (c & (a | b))
    select, zero, one = read
    return (zero & ~select) | (one & select)
