"""gray-rom: a read-only memory of Gray words, so that two neighbouring lines at once cost little; XOR gates convert."""

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes.lines import (
    Codes,
    Words,
    above,
    bits_of,
    gray,
    gray_to_binary,
    line_gates,
    or_of,
    wired_or,
    xor_chain,
)


def decode(words: Words) -> Codes:
    """OR of the Gray addresses of all lines with threshold k passed and k + 1 not, converted to binary."""
    addresses = gray(np.arange(1, words.shape[1] + 1))
    return gray_to_binary(or_of(words & ~above(words), addresses), bits_of(words))


def build(bits: int) -> Netlist:
    """Lines and wired ORs as in a binary read-only memory, then a chain of XOR gates from the top bit down."""
    b = Builder(bits)
    stored = wired_or(b, line_gates(b), gray(np.arange(1, b.lines + 1)))
    return b.finish("gray-rom", xor_chain(b, stored))
