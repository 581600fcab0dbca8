"""Gray ROM: the Gray addresses of all edges ORed, then turned to binary; two neighbouring edges differ in one bit."""

import numpy as np

from flashplan.decoder.lines import (
    Codes,
    Words,
    binary_gates,
    edge_gates,
    edge_lines,
    from_gray,
    gray,
    or_of_addresses,
    rom_gates,
)
from flashplan.decoder.netlist import Builder, Netlist


def decode(words: Words) -> Codes:
    """Word by word: OR of the Gray code of k over all edges k, then binary."""
    count = words.shape[1]
    return from_gray(
        or_of_addresses(edge_lines(words), gray(np.arange(1, count + 1))),
        count.bit_length(),
    )


def build(bits: int) -> Netlist:
    """The lines and plane of a ROM with Gray addresses, and a chain of XOR."""
    gates = Builder(bits)
    lines = edge_gates(gates, list(gates.inputs))
    return gates.finish(
        binary_gates(gates, rom_gates(gates, lines, gray(np.arange(1, 2**bits))))
    )
