"""What the schemes share: the padded word, one-hot lines, and Gray code, in numpy and in gates."""

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder.netlist import Builder

Words = NDArray[np.bool_]
Codes = NDArray[np.int64]


def bits_of(words: Words) -> int:
    """Bits of a word of 2**bits - 1 decisions."""
    return int(words.shape[1]).bit_length()


def above(words: Words, distance: int = 1) -> Words:
    """For each threshold the decision so many thresholds higher; 0 past the top."""
    shifted = np.zeros_like(words)
    shifted[:, :-distance] = words[:, distance:]
    return shifted


def below(words: Words) -> Words:
    """For each threshold the decision one threshold lower; 1 under the bottom."""
    shifted = np.ones_like(words)
    shifted[:, 1:] = words[:, :-1]
    return shifted


def or_of(lines: Words, addresses: Codes) -> Codes:
    """Bitwise OR of the addresses (M,) of all active lines (n, M); (n,)."""
    words = np.zeros(lines.shape[0], dtype=np.int64)
    rows, columns = np.nonzero(lines)
    np.bitwise_or.at(words, rows, addresses[columns])
    return words


def gray(codes: Codes) -> Codes:
    """Gray code of binary codes.

    >>> gray(np.arange(4)).tolist()
    [0, 1, 3, 2]
    """
    return codes ^ (codes >> 1)


def gray_to_binary(codes: Codes, bits: int) -> Codes:
    """Binary code of Gray codes: each bit the parity of all Gray bits from the top down to it."""
    binary = codes.copy()
    for shift in range(1, bits):
        binary ^= codes >> shift
    return binary


def line_gates(b: Builder) -> list[str]:
    """One net per threshold k: passed, and k + 1 not."""
    ends = [b.gate("not", b.t(k + 1)) for k in range(1, b.lines)]
    pairs = [b.gate("and", b.t(k), ends[k - 1]) for k in range(1, b.lines)]
    return [*pairs, b.t(b.lines)]


def wired_or(b: Builder, lines: list[str], addresses: Codes) -> list[str]:
    """Word bits of a read-only memory: each a wired OR of the lines whose address has that bit."""
    return [
        b.gate(
            "wired-or",
            *(net for net, a in zip(lines, addresses, strict=True) if a >> bit & 1),
        )
        for bit in range(b.bits)
    ]


def xor_chain(b: Builder, gray_bits: list[str]) -> list[str]:
    """Binary bits of Gray bits, lowest first: from the top down, one XOR a bit."""
    binary = [gray_bits[-1]]
    for net in reversed(gray_bits[:-1]):
        binary.insert(0, b.gate("xor", binary[0], net))
    return binary


def ones_gates(b: Builder, nets: list[str]) -> list[str]:
    """Bits of the number of ones among 2**n - 1 nets, lowest first: 2**n - n - 1 full adders, 2 n - 3 deep.

    Two counters of half the nets each, and a ripple adder that takes the net left over as its carry in.
    Source: C. S. Wallace, "A suggestion for a fast multiplier", IEEE Trans. Electronic Computers 13(1), 1964 (memory).
    """
    if len(nets) == 1:
        return nets
    half = len(nets) // 2
    low, high, carry = (
        ones_gates(b, nets[:half]),
        ones_gates(b, nets[half:-1]),
        nets[-1],
    )
    total = []
    for one, other in zip(low, high, strict=True):
        bit, carry = b.full_adder(one, other, carry)
        total.append(bit)
    return [*total, carry]
