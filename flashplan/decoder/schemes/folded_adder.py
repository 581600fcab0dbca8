"""folded-adder: multiplexers find the upper half of the bits, an adder tree counts what is left."""

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes.lines import Codes, Words, bits_of, ones_gates
from flashplan.decoder.schemes.mux_tree import fold, fold_gates


def decode(words: Words) -> Codes:
    """Top floor(bits / 2) bits as in a multiplexer tree, the rest the number of ones in the part chosen."""
    bits = bits_of(words)
    codes = np.zeros(words.shape[0], dtype=np.int64)
    for bit in range(bits - 1, bits - 1 - bits // 2, -1):
        middle, words = fold(words)
        codes |= middle.astype(np.int64) << bit
    return codes + words.sum(axis=1, dtype=np.int64)


def build(bits: int) -> Netlist:
    """The multiplexers of the first floor(bits / 2) folds, then full adders for the chosen part."""
    b = Builder(bits)
    nets = [b.t(k) for k in range(1, b.lines + 1)]
    top: list[str] = []
    for _ in range(bits // 2):
        middle, nets = fold_gates(b, nets)
        top.insert(0, middle)
    return b.finish("folded-adder", ones_gates(b, nets) + top)
