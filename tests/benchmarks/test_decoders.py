"""Speed of gates evaluated 64 words to a machine word, beside one boolean a byte."""

import numpy as np
import pytest

from flashplan.decoder.evaluate import compile_netlist, evaluate, pack, run
from flashplan.decoder.schemes import SCHEMES

WORDS = 2**20


@pytest.fixture(scope="module")
def lanes():
    rng = np.random.default_rng(8)
    width = 255
    packed = rng.integers(0, 2**64, (width, WORDS // 64), dtype=np.uint64)
    return packed


def test_ones_counter_at_8_bits_64_words_to_a_machine_word(benchmark, lanes):
    program = compile_netlist(SCHEMES["ones-counter"].build(8))
    benchmark(run, program, lanes)
    speed = WORDS / benchmark.stats.stats.min
    benchmark.extra_info["words_per_second"] = speed
    assert speed >= 20e6


def test_ones_counter_at_8_bits_one_boolean_a_byte(benchmark, lanes):
    program = compile_netlist(SCHEMES["ones-counter"].build(8))
    part = np.unpackbits(lanes[:, : WORDS // 512].view(np.uint8), axis=1).astype(bool)
    benchmark(run, program, part)
    benchmark.extra_info["words_per_second"] = part.shape[1] / benchmark.stats.stats.min


def test_all_schemes_on_a_million_8_bit_words(benchmark):
    rng = np.random.default_rng(9)
    words = np.arange(255) < rng.integers(0, 256, (WORDS, 1))
    words ^= rng.random(words.shape, dtype=np.float32) < 0.01

    def every():
        packed = pack(words)
        return [
            run(compile_netlist(scheme.build(8)), packed) for scheme in SCHEMES.values()
        ]

    results = benchmark.pedantic(every, rounds=1)
    assert benchmark.stats.stats.min < 10
    program = compile_netlist(SCHEMES["ones-counter"].build(8))
    assert np.array_equal(evaluate(program, words[:100]), words[:100].sum(axis=1))
    assert len(results) == len(SCHEMES)
