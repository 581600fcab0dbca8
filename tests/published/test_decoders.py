"""Decoders against published bubble patterns, gate and adder counts, and Python's own integers."""

import networkx as nx
import numpy as np
import pytest

from flashplan.decoder import decode
from flashplan.decoder.evaluate import compile_netlist, evaluate
from flashplan.decoder.netlist import depth, gate_counts, gate_total
from flashplan.decoder.schemes import SCHEMES
from flashplan.decoder.schemes.gray_logic import spans
from flashplan.metrics.bubbles import count_bubbles_by_order, edges


def word(text):
    """A word written lowest threshold first."""
    return np.array([[bit == "1" for bit in text]])


# Computed apart from this package from the definitions of the circuits (1-of-n detectors into a wired-OR memory, Gray memory, multiplexer
# tree), no paper: the decoders' textbook weaknesses.
PATTERNS = {
    "111111111111100": (13, 13, 13, 13, 13),
    "111111111111010": (13, 14, 12, 13, 14),
    "111111111111001": (13, 15, 12, 12, 12),
    "111111101111100": (12, 15, 15, 10, 7),
}
NAMES = ("ones-counter", "rom", "rom-3and", "gray-rom", "mux-tree")


@pytest.mark.parametrize("text", PATTERNS)
def test_bubble_patterns_give_the_words_computed_apart(text):
    assert tuple(int(decode(name, word(text))[0]) for name in NAMES) == PATTERNS[text]


# Majority of three and then the number of ones, the same patterns.
@pytest.mark.parametrize(
    ("text", "code"), list(zip(PATTERNS, (13, 13, 12, 13), strict=True))
)
def test_majority_then_ones_of_the_same_patterns(text, code):
    bits = np.array([1, *word(text)[0], 0])
    voted = bits[:-2] + bits[1:-1] + bits[2:] >= 2
    assert voted.sum() == code
    if voted.tolist() == sorted(voted.tolist(), reverse=True):
        assert decode("majority-rom", word(text))[0] == code


# "Bubble error correction", vlsiuniverse.blogspot.com, 2016; its strings are written highest threshold first.
@pytest.mark.parametrize(
    ("text", "orders"),
    [
        ("0010001101", {1: 2}),
        ("01100001111", {2: 1}),
        ("00011100000000010111", {3: 1, 1: 1}),
    ],
)
def test_published_strings_have_the_published_bubble_orders(text, orders):
    assert count_bubbles_by_order(word(text[::-1])) == orders


def test_a_published_ambiguous_string_gets_one_of_its_acceptable_repairs():
    # The same page: 01111111, 00111111 or 00011111 for 01011111.
    assert edges(word("01011111"[::-1]))[0] in (5, 6, 7)


# Adders of a ones-counter by bits, 2**N - N - 1 and 2 N - 3 deep: E. Sall, M. Vesterbacka, "A multiplexer based decoder for
# flash analog-to-digital converters", TENCON 2004, as remembered for the counts; depths by recursion.
ADDERS = {3: (4, 3), 4: (11, 5), 5: (26, 7), 6: (57, 9), 7: (120, 11), 8: (247, 13)}


@pytest.mark.parametrize("bits", ADDERS)
def test_ones_counter_has_the_published_adders_and_depth(bits):
    netlist = SCHEMES["ones-counter"].build(bits)
    counts = gate_counts(netlist)
    assert counts == {"sum": ADDERS[bits][0], "carry": ADDERS[bits][0]}
    assert depth(netlist) == ADDERS[bits][1]


# Multiplexers of the tree by bits and their critical path of N - 1: the same paper, from memory.
@pytest.mark.parametrize("bits", range(2, 11))
def test_multiplexer_tree_has_the_published_count_and_depth(bits):
    netlist = SCHEMES["mux-tree"].build(bits)
    assert gate_counts(netlist) == {"mux": 2**bits - bits - 1}
    assert depth(netlist) == bits - 1


def test_gray_bits_of_a_three_bit_converter():
    # The reflected code of F. Gray, US patent 2632058, 1953: G2 = T4, G1 = T2 not T6, G0 = T1 not T3 or T5 not T7.
    found = [spans(3, bit) for bit in range(3)]
    assert found == [[(1, 3), (5, 7)], [(2, 6)], [(4, None)]]


@pytest.mark.parametrize("bits", [3, 8])
def test_ones_counter_gates_count_like_python_integers(bits):
    width = 2**bits - 1
    rng = np.random.default_rng(1)
    words = rng.random((500, width)) < rng.random((500, 1))
    program = compile_netlist(SCHEMES["ones-counter"].build(bits))
    expected = [
        int("".join("01"[bit] for bit in row), 2).bit_count() for row in words.tolist()
    ]
    assert evaluate(program, words).tolist() == expected


@pytest.mark.parametrize("name", SCHEMES)
def test_netlists_are_acyclic_and_as_deep_as_networkx_generations_say(name):
    netlist = SCHEMES[name].build(5)
    generations = list(nx.topological_generations(netlist.graph))
    assert depth(netlist) == len(generations) - 1
    assert gate_total(netlist) == sum(gate_counts(netlist).values())
