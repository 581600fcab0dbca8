"""Fat tree: the ROM's lines ORed through balanced trees of two-input gates instead of wires."""

from flashplan.decoder.lines import Codes, Words, edge_gates
from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes import rom


def decode(words: Words) -> Codes:
    """Word by word the same as the ROM."""
    return rom.decode(words)


def build(bits: int) -> Netlist:
    """A balanced tree of OR gates for each bit. Source: D. Lee, J. Yoo et al., 2002 (memory)."""
    gates = Builder(bits)
    lines = edge_gates(gates, list(gates.inputs))
    return gates.finish(
        [
            gates.any_of([line for k, line in enumerate(lines, 1) if k >> bit & 1])
            for bit in range(bits)
        ]
    )
