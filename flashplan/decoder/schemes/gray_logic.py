"""Gray logic: each Gray bit straight from the decisions at which it rises and falls, without lines or ROM."""

import numpy as np

from flashplan.decoder.lines import Codes, Words, binary_gates, from_gray
from flashplan.decoder.netlist import Builder, Netlist


def decode(words: Words) -> Codes:
    """Word by word: Gray bit j is t_a and not t_b, ORed over the pairs where it rises at a and falls at b; then binary."""
    bits = words.shape[1].bit_length()
    codes = np.zeros(words.shape[0], dtype=np.int64)
    for bit in range(bits):
        rises, falls = _pairs(bit, bits)
        high = words[:, rises - 1].copy()
        high[:, : falls.size] &= ~words[:, falls - 1]
        codes |= high.any(axis=1).astype(np.int64) << bit
    return from_gray(codes, bits)


def build(bits: int) -> Netlist:
    """One AND for each pair, a balanced OR for each bit, and a chain of XOR."""
    gates = Builder(bits)
    t = gates.inputs
    gray_bits = []
    for bit in range(bits):
        rises, falls = _pairs(bit, bits)
        pairs = [
            gates.gate("and-not", t[a - 1], t[b - 1])
            for a, b in zip(rises, falls, strict=False)
        ]
        gray_bits.append(gates.any_of(pairs + [t[a - 1] for a in rises[falls.size :]]))
    return gates.finish(binary_gates(gates, gray_bits))


def _pairs(bit: int, bits: int) -> tuple[np.ndarray, np.ndarray]:
    """Thresholds, from 1, at which a Gray bit rises and falls."""
    return np.arange(2**bit, 2**bits, 2 ** (bit + 2)), np.arange(
        3 * 2**bit, 2**bits, 2 ** (bit + 2)
    )
