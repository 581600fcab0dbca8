"""rom-3and: a read-only memory whose lines also ask that the threshold below is passed."""

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes.lines import Codes, Words, above, below, or_of, wired_or


def decode(words: Words) -> Codes:
    """OR of the binary addresses k of all lines with thresholds k - 1 and k passed and k + 1 not."""
    lines = below(words) & words & ~above(words)
    return or_of(lines, np.arange(1, words.shape[1] + 1))


def build(bits: int) -> Netlist:
    """An inverter and a three-input AND gate per line, a wired OR per bit."""
    b = Builder(bits)
    lines = []
    for k in range(1, b.lines + 1):
        reads = [b.t(k - 1)] if k > 1 else []
        reads.append(b.t(k))
        if k < b.lines:
            reads.append(b.gate("not", b.t(k + 1)))
        lines.append(b.gate("and", *reads))
    return b.finish("rom-3and", wired_or(b, lines, np.arange(1, b.lines + 1)))
