"""A decoder as a directed graph of simple gates: how it is built, and what can be read off the graph."""

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

import networkx as nx

# Static CMOS transistors of a gate with k inputs: NAND and NOR plus an inverter for AND and OR, the 28-transistor mirror
# adder split into its two outputs, transmission gates for MUX and XOR; a wired OR is one pull-down per input, a pull-up and
# the inverter that makes OR of it. Common practice, no source.
_TRANSISTORS = {
    "not": (2, 0),
    "and": (2, 2),
    "or": (2, 2),
    "xor": (2, 4),
    "mux": (6, 0),
    "sum": (16, 0),
    "carry": (12, 0),
    "wired-or": (3, 1),
}


@dataclass(frozen=True)
class Netlist:
    """A decoder's gates.

    graph: nodes are net names, each after the nets that its gate reads; node data `kind` is "input" or a gate kind and
    `inputs` the driving nets in the order that the gate takes them (mux: select, when 0, when 1).
    inputs: nets t1 .. tM, lowest threshold first. outputs: nets of word bits 0 .. bits - 1.
    """

    name: str
    graph: nx.DiGraph
    inputs: tuple[str, ...]
    outputs: tuple[str, ...]


class Builder:
    """Collects gates into a netlist; every method takes nets and returns the new gate's net.

    >>> b = Builder(2)
    >>> net = b.gate("and", b.t(1), b.gate("not", b.t(2)))
    >>> gate_counts(b.finish("one-line", [net, b.t(2)]))
    {'not': 1, 'and': 1}
    """

    def __init__(self, bits: int) -> None:
        self.bits = bits
        self.lines = 2**bits - 1
        self._graph: nx.DiGraph = nx.DiGraph()
        self._inputs = tuple(f"t{k}" for k in range(1, self.lines + 1))
        self._graph.add_nodes_from(self._inputs, kind="input", inputs=())

    def t(self, threshold: int) -> str:
        """The decision at one threshold, 1 .. 2**bits - 1."""
        return self._inputs[threshold - 1]

    def gate(self, kind: str, *inputs: str) -> str:
        """Add one gate. A one-input and, or, wired-or is a wire."""
        if len(inputs) == 1 and kind in ("and", "or", "wired-or"):
            return inputs[0]
        net = f"g{self._graph.number_of_nodes() - self.lines}"
        self._graph.add_node(net, kind=kind, inputs=inputs)
        self._graph.add_edges_from((source, net) for source in inputs)
        return net

    def full_adder(self, a: str, b: str, c: str) -> tuple[str, str]:
        """Sum and carry of three bits of equal weight."""
        return self.gate("sum", a, b, c), self.gate("carry", a, b, c)

    def tree(self, kind: str, inputs: Sequence[str]) -> str:
        """A balanced tree of two-input gates."""
        level = list(inputs)
        while len(level) > 1:
            pairs = [
                self.gate(kind, *level[i : i + 2]) for i in range(0, len(level) - 1, 2)
            ]
            level = pairs + level[len(level) - len(level) % 2 :]
        return level[0]

    def finish(self, name: str, outputs: Sequence[str]) -> Netlist:
        """The netlist with the given word bits, lowest first; gates that no output needs are left out."""
        graph = self._graph.copy()
        needed = set(outputs).union(*(nx.ancestors(graph, net) for net in outputs))
        needed.update(self._inputs)
        graph.remove_nodes_from([net for net in self._graph if net not in needed])
        return Netlist(name, graph, self._inputs, tuple(outputs))


def gates(netlist: Netlist) -> list[str]:
    """Nets of all gates, each after the nets that it reads."""
    nodes = netlist.graph.nodes
    return [net for net in nodes if nodes[net]["kind"] != "input"]


def gate_counts(netlist: Netlist) -> dict[str, int]:
    """Number of gates of each kind."""
    nodes = netlist.graph.nodes
    return dict(Counter(nodes[net]["kind"] for net in gates(netlist)))


def gate_total(netlist: Netlist) -> int:
    """Number of gates; a full adder is two (sum and carry), a wired OR of any width one."""
    return netlist.graph.number_of_nodes() - len(netlist.inputs)


def depth(netlist: Netlist) -> int:
    """Gates on the longest way from a decision to a word bit; a full adder counts as one."""
    return len(nx.dag_longest_path(netlist.graph)) - 1


def fan_out(netlist: Netlist) -> dict[str, int]:
    """How many gate inputs and word bits read each net."""
    reads = Counter(
        source
        for net in netlist.graph.nodes
        for source in netlist.graph.nodes[net]["inputs"]
    )
    reads.update(netlist.outputs)
    return {net: reads[net] for net in netlist.graph.nodes}


def transistors(netlist: Netlist) -> int:
    """Estimated transistors of a static CMOS build; see the table in this file for what each gate costs."""
    total = 0
    for net in gates(netlist):
        node = netlist.graph.nodes[net]
        fixed, each = _TRANSISTORS[node["kind"]]
        total += fixed + each * len(node["inputs"])
    return total
