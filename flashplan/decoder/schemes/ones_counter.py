"""Ones counter: all decisions added by a tree of full adders, whatever their order."""

import numpy as np

from flashplan.decoder.lines import Codes, Words
from flashplan.decoder.netlist import Builder, Netlist


def decode(words: Words) -> Codes:
    """Word by word: the number of thresholds passed."""
    return np.count_nonzero(words, axis=1).astype(np.int64)


def build(bits: int) -> Netlist:
    """Two halves counted, and their counts added with the middle decision as carry: 2^N - N - 1 full adders.

    Source: E. E. Swartzlander, "Parallel counters", IEEE Trans. Computers 22(11), 1973 (memory).
    """
    gates = Builder(bits)
    return gates.finish(_count(gates, list(gates.inputs)))


def _count(gates: Builder, nodes: list[str]) -> list[str]:
    if len(nodes) == 1:
        return nodes
    half = len(nodes) // 2
    carry = nodes[half]
    total = []
    for a, b in zip(
        _count(gates, nodes[:half]), _count(gates, nodes[half + 1 :]), strict=True
    ):
        total.append(gates.gate("xor", a, b, carry))
        carry = gates.gate("majority", a, b, carry)
    return [*total, carry]
