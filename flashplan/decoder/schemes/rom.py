"""ROM: the binary addresses of all edges in the thermometer word, ORed."""

import numpy as np

from flashplan.decoder.lines import (
    Codes,
    Words,
    edge_gates,
    edge_lines,
    or_of_addresses,
    rom_gates,
)
from flashplan.decoder.netlist import Builder, Netlist


def decode(words: Words) -> Codes:
    """Word by word: OR of k over all k with threshold k passed and k + 1 not."""
    return or_of_addresses(edge_lines(words), np.arange(1, words.shape[1] + 1))


def build(bits: int) -> Netlist:
    """One AND for each line, one wired OR for each bit."""
    gates = Builder(bits)
    lines = edge_gates(gates, list(gates.inputs))
    return gates.finish(rom_gates(gates, lines, np.arange(1, 2**bits)))
