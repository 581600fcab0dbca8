"""gray-logic: each Gray bit straight from the pairs of decisions between which it is 1."""

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes.lines import (
    Codes,
    Words,
    bits_of,
    gray_to_binary,
    xor_chain,
)


def spans(bits: int, bit: int) -> list[tuple[int, int | None]]:
    """Thresholds (rise, fall) between which a Gray bit is 1; the top bit rises once and never falls.

    >>> spans(3, 0), spans(3, 2)
    ([(1, 3), (5, 7)], [(4, None)])
    """
    if bit == bits - 1:
        return [(2**bit, None)]
    step = 2**bit
    return [(rise, rise + 2 * step) for rise in range(step, 2**bits, 4 * step)]


def decode(words: Words) -> Codes:
    """Gray bit = OR over its spans of (rise passed and fall not); then binary."""
    bits = bits_of(words)
    codes = np.zeros(words.shape[0], dtype=np.int64)
    for bit in range(bits):
        level = np.zeros(words.shape[0], dtype=bool)
        for rise, fall in spans(bits, bit):
            level |= words[:, rise - 1] & (
                True if fall is None else ~words[:, fall - 1]
            )
        codes |= level.astype(np.int64) << bit
    return gray_to_binary(codes, bits)


def build(bits: int) -> Netlist:
    """An inverter and an AND gate per span, balanced OR trees, a chain of XOR gates."""
    b = Builder(bits)
    word = []
    for bit in range(bits):
        terms = [
            b.t(rise)
            if fall is None
            else b.gate("and", b.t(rise), b.gate("not", b.t(fall)))
            for rise, fall in spans(bits, bit)
        ]
        word.append(b.tree("or", terms))
    return b.finish("gray-logic", xor_chain(b, word))
