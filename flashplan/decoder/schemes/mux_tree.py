"""Multiplexer tree: the middle decision is the top bit and chooses the half to search next."""

import numpy as np

from flashplan.decoder.lines import Codes, Words
from flashplan.decoder.netlist import Builder, Netlist


def decode(words: Words) -> Codes:
    """Word by word: a binary search that trusts each middle decision."""
    codes = np.zeros(words.shape[0], dtype=np.int64)
    row = np.arange(words.shape[0])
    step = (words.shape[1] + 1) // 2
    while step:
        codes = np.where(words[row, codes + step - 1], codes + step, codes)
        step //= 2
    return codes


def build(bits: int) -> Netlist:
    """2^N - N - 1 multiplexers. Source: E. Sall and M. Vesterbacka, 2004 (memory)."""
    gates = Builder(bits)
    nodes, outputs = list(gates.inputs), []
    while len(nodes) > 1:
        half = len(nodes) // 2
        select = nodes[half]
        outputs.append(select)
        nodes = [
            gates.gate("mux", select, low, high)
            for low, high in zip(nodes[:half], nodes[half + 1 :], strict=True)
        ]
    return gates.finish([*nodes, *outputs[::-1]])
