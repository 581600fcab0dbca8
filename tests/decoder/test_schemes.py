"""Every scheme's gates give what its word definition says."""

import numpy as np
import pytest

from flashplan.decoder import decode
from flashplan.decoder.evaluate import compile_netlist, evaluate
from flashplan.decoder.schemes import SCHEMES
from flashplan.decoder.words import clean_words
from flashplan.errors import InputError


def all_words(width):
    return (np.arange(2**width)[:, None] >> np.arange(width) & 1).astype(bool)


def bubbly_words(bits, count, rng):
    words = clean_words(2**bits - 1)[rng.integers(0, 2**bits, count)].copy()
    flips = rng.random(words.shape) < rng.choice([0.002, 0.02, 0.2], (count, 1))
    return words ^ flips


@pytest.mark.parametrize("name", SCHEMES)
@pytest.mark.parametrize("bits", [2, 3, 4])
def test_gates_equal_the_word_definition_on_all_patterns(name, bits):
    words = all_words(2**bits - 1)
    program = compile_netlist(SCHEMES[name].build(bits))
    assert np.array_equal(evaluate(program, words), decode(name, words))


@pytest.mark.parametrize("name", SCHEMES)
@pytest.mark.parametrize("bits", [6, 8])
def test_gates_equal_the_word_definition_on_random_and_bubbly_words(name, bits):
    rng = np.random.default_rng(bits)
    random = rng.random((1000, 2**bits - 1)) < 0.5
    words = np.concatenate([random, bubbly_words(bits, 3000, rng)])
    program = compile_netlist(SCHEMES[name].build(bits))
    assert np.array_equal(evaluate(program, words), decode(name, words))


@pytest.mark.parametrize("name", SCHEMES)
@pytest.mark.parametrize("bits", range(2, 13))
def test_clean_words_decode_to_their_number_of_ones(name, bits):
    words = clean_words(2**bits - 1)
    assert np.array_equal(decode(name, words), np.arange(2**bits))


@pytest.mark.parametrize("name", SCHEMES)
@pytest.mark.parametrize("bits", [5, 10])
def test_gates_decode_clean_words(name, bits):
    program = compile_netlist(SCHEMES[name].build(bits))
    words = clean_words(2**bits - 1)
    assert np.array_equal(evaluate(program, words), np.arange(2**bits))


def test_no_words_give_no_codes():
    assert decode("rom", np.zeros((0, 7), dtype=bool)).shape == (0,)


def test_an_unknown_scheme_names_the_known_ones():
    with pytest.raises(InputError, match="known ones are rom, rom-3and"):
        decode("room", np.zeros((1, 7), dtype=bool))


@pytest.mark.parametrize("shape", [(1, 8), (7,), (1, 1), (1, 0)])
def test_words_of_a_wrong_shape_are_refused(shape):
    with pytest.raises(InputError, match="shape"):
        decode("rom", np.zeros(shape, dtype=bool))


def test_decisions_other_than_zero_and_one_are_refused():
    with pytest.raises(InputError, match="neither 0 nor 1"):
        decode("rom", np.full((1, 7), 2))
