"""rom: a pair detector per threshold addresses a wired-OR read-only memory of binary words."""

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes.lines import (
    Codes,
    Words,
    above,
    line_gates,
    or_of,
    wired_or,
)


def decode(words: Words) -> Codes:
    """OR of the binary addresses k of all lines with threshold k passed and k + 1 not."""
    return or_of(words & ~above(words), np.arange(1, words.shape[1] + 1))


def build(bits: int) -> Netlist:
    """An inverter and an AND gate per line, a wired OR per bit."""
    b = Builder(bits)
    return b.finish("rom", wired_or(b, line_gates(b), np.arange(1, b.lines + 1)))
