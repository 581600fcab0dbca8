"""Decoders against published counts and patterns."""

import itertools

import numpy as np
import pytest

from flashplan.decoder import SCHEMES, decode
from flashplan.decoder.netlist import depth, evaluate, gate_counts
from flashplan.metrics.bubbles import count_bubbles_by_order


def words(*texts: str) -> np.ndarray:
    return np.array([[letter == "1" for letter in text] for text in texts])


PATTERNS = ("111111111111100", "111111111111010", "111111111111001", "111111101111100")


@pytest.mark.parametrize(
    ("scheme", "codes"),
    [
        ("ones-counter", (13, 13, 13, 12)),
        ("rom", (13, 14, 15, 15)),
        ("rom-3and", (13, 12, 12, 15)),
        ("gray-rom", (13, 13, 12, 10)),
        ("mux-tree", (13, 14, 12, 7)),
        ("fat-tree", (13, 14, 15, 15)),
    ],
)
def test_patterns_of_fifteen_decisions(scheme: str, codes: tuple[int, ...]) -> None:
    # Worked out by hand from the schemes' word definitions, lowest decision first.
    assert tuple(decode(scheme, words(*PATTERNS))) == codes


def test_direct_gray_logic_on_published_patterns() -> None:
    # edaboard.com thread 93268, "gray-code bubble correction": Gray 1011, 1000, 1010 = 13, 15, 12.
    assert tuple(decode("gray-logic", words(*PATTERNS[:3]))) == (13, 15, 12)


@pytest.mark.parametrize("bits", [2, 3, 4, 6, 8])
def test_a_tree_of_full_adders_or_multiplexers_has_the_published_size(
    bits: int,
) -> None:
    # Swartzlander 1973 (adders), Sall and Vesterbacka 2004 (both; memory): 2^N - N - 1; depth 2N - 3 in full adders.
    adders = SCHEMES["ones-counter"].build(bits)
    assert gate_counts(adders) == {
        "xor": 2**bits - bits - 1,
        "majority": 2**bits - bits - 1,
    }
    assert depth(adders) == 2 * bits - 3
    assert gate_counts(SCHEMES["mux-tree"].build(bits)) == {"mux": 2**bits - bits - 1}


def test_the_ones_counter_is_pythons_own_popcount() -> None:
    drawn = np.random.default_rng(0).random((2000, 255)) < 0.5
    counted = [
        int("".join(str(int(bit)) for bit in row), 2).bit_count() for row in drawn
    ]
    np.testing.assert_array_equal(
        evaluate(SCHEMES["ones-counter"].build(8), drawn), counted
    )


def test_orders_of_bubbles_as_in_the_usual_vocabulary() -> None:
    # vlsiuniverse.blogspot.com, "bubble error correction" (2016): the words stand there highest threshold first.
    for text, orders in (
        ("0010001101", {1: 2}),
        ("01100001111", {2: 1}),
        ("00011100000000010111", {1: 1, 3: 1}),
        ("01011111", {1: 1}),
    ):
        assert count_bubbles_by_order(words(text[::-1])) == orders


@pytest.mark.parametrize("name", list(SCHEMES))
def test_gates_do_what_the_word_definition_says(name: str) -> None:
    for bits in (2, 3):
        every = np.array(list(itertools.product((False, True), repeat=2**bits - 1)))
        np.testing.assert_array_equal(
            evaluate(SCHEMES[name].build(bits), every), decode(name, every)
        )
    every = (np.arange(2**15)[:, None] >> np.arange(15) & 1).astype(bool)
    np.testing.assert_array_equal(
        evaluate(SCHEMES[name].build(4), every), decode(name, every)
    )
    draw = np.random.default_rng(1)
    for bits in (6, 8):
        value = draw.uniform(0, 2**bits, (3000, 1))
        bubbly = value > np.arange(1, 2**bits) + draw.normal(
            0, 1.5, (3000, 2**bits - 1)
        )
        np.testing.assert_array_equal(
            evaluate(SCHEMES[name].build(bits), bubbly), decode(name, bubbly)
        )


@pytest.mark.parametrize("name", list(SCHEMES))
def test_a_clean_word_is_its_number_of_ones(name: str) -> None:
    for bits in range(2, 13):
        clean = np.tri(2**bits, 2**bits - 1, -1, dtype=bool)
        np.testing.assert_array_equal(decode(name, clean), np.arange(2**bits))
