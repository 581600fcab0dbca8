"""ones-counter: a tree of full adders counts the decisions, whatever their order."""

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes.lines import Codes, Words, ones_gates


def decode(words: Words) -> Codes:
    """Number of thresholds passed."""
    return words.sum(axis=1, dtype=np.int64)


def build(bits: int) -> Netlist:
    """2**bits - bits - 1 full adders, 2 bits - 3 of them in a row."""
    b = Builder(bits)
    nets = [b.t(k) for k in range(1, b.lines + 1)]
    return b.finish("ones-counter", ones_gates(b, nets))
