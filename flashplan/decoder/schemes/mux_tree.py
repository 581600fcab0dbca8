"""mux-tree: the middle decision is the top bit and chooses the half in which the search goes on."""

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes.lines import Codes, Words, bits_of


def fold(words: Words) -> tuple[Words, Words]:
    """The middle decision (n,), and the half that it chooses (n, (M - 1) / 2): upper where it is 1."""
    half = words.shape[1] // 2
    middle = words[:, half]
    chosen = np.where(middle[:, None], words[:, half + 1 :], words[:, :half])
    return middle, chosen


def fold_gates(b: Builder, nets: list[str]) -> tuple[str, list[str]]:
    """The fold in gates: a multiplexer for each pair of decisions."""
    half = len(nets) // 2
    middle = nets[half]
    pairs = zip(nets[:half], nets[half + 1 :], strict=True)
    return middle, [b.gate("mux", middle, low, high) for low, high in pairs]


def decode(words: Words) -> Codes:
    """Top bit from the middle decision, the bits below from the half that it chooses, and so on."""
    codes = np.zeros(words.shape[0], dtype=np.int64)
    for bit in reversed(range(bits_of(words))):
        middle, words = fold(words)
        codes |= middle.astype(np.int64) << bit
    return codes


def build(bits: int) -> Netlist:
    """2**bits - bits - 1 multiplexers, bits - 1 of them in a row."""
    b = Builder(bits)
    nets = [b.t(k) for k in range(1, b.lines + 1)]
    word: list[str] = []
    while nets:
        middle, nets = fold_gates(b, nets)
        word.insert(0, middle)
    return b.finish("mux-tree", word)
