"""The one-out-of-many lines between thermometer and ROM, and the Gray code: what several schemes share."""

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder.netlist import Builder

Words = NDArray[np.bool_]
Codes = NDArray[np.int64]


def edge_lines(words: Words) -> Words:
    """Line k, (n, M): threshold k is passed and k + 1 is not; above the last none is passed."""
    above = np.concatenate(
        [words[:, 1:], np.zeros((words.shape[0], 1), dtype=bool)], axis=1
    )
    return words & ~above


def or_of_addresses(lines: Words, addresses: Codes) -> Codes:
    """OR of the addresses (M,) of all lines that are high, (n,)."""
    codes = np.zeros(lines.shape[0], dtype=np.int64)
    for bit in range(int(addresses.max()).bit_length()):
        codes |= (
            lines[:, (addresses >> bit) & 1 == 1].any(axis=1).astype(np.int64) << bit
        )
    return codes


def gray(codes: Codes) -> Codes:
    """Gray code of binary codes. Source: F. Gray, US patent 2632058, 1953 (memory)."""
    return codes ^ (codes >> 1)


def from_gray(codes: Codes, bits: int) -> Codes:
    """Binary codes of Gray codes: each bit is the parity of all Gray bits from it upwards."""
    shift = 1
    while shift < bits:
        codes = codes ^ (codes >> shift)
        shift *= 2
    return codes


def edge_gates(build: Builder, thresholds: list[str]) -> list[str]:
    """Gates of `edge_lines`; the last line is the last threshold itself."""
    return [
        build.gate("and-not", low, high)
        for low, high in zip(thresholds[:-1], thresholds[1:], strict=True)
    ] + thresholds[-1:]


def rom_gates(build: Builder, lines: list[str], addresses: Codes) -> list[str]:
    """A ROM plane: one wired OR for each bit of the addresses, lowest first."""
    width = int(addresses.max()).bit_length()
    return [
        build.gate(
            "wired-or",
            *(
                line
                for line, address in zip(lines, addresses, strict=True)
                if address >> bit & 1
            ),
        )
        for bit in range(width)
    ]


def binary_gates(build: Builder, gray_bits: list[str]) -> list[str]:
    """Gray to binary, lowest bit first: a chain of XOR from the top bit down."""
    bits = [gray_bits[-1]]
    for node in gray_bits[-2::-1]:
        bits.append(build.gate("xor", bits[-1], node))
    return bits[::-1]
