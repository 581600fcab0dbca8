"""The comparison on words whose errors are known by hand."""

import json

import numpy as np
import pytest

from flashplan.decoder import DecoderWords, compare_schemes, decode, rank
from flashplan.plan import plan_from_table


def plan_of(bits, **decoder):
    return plan_from_table(
        {
            "converter": {
                "bits": bits,
                "sample_rate": 1e9,
                "input_frequency": 1e8,
                "full_scale": 1.0,
                "supply": 1.0,
            },
            "goals": {"enob": bits - 0.5, "word_error_rate": 1e-9},
            "decoder": decoder,
        }
    )


def words_of(bits, bubbly=(), clean=100, undecided=(), at=(), weight=()):
    width = 2**bits - 1
    return DecoderWords(
        np.array(bubbly, dtype=bool).reshape(-1, width),
        np.full(width + 1, clean),
        np.array(undecided, dtype=bool).reshape(-1, width),
        np.array(at, dtype=np.int64),
        np.array(weight, dtype=float),
    )


BUBBLY = [[1, 1, 0, 1, 0, 0, 0], [1, 0, 1, 1, 0, 0, 0]]


def by_name(table):
    return {scheme.name: scheme for scheme in table.schemes}


def test_errors_equal_the_word_definitions():
    table = compare_schemes(plan_of(3), words_of(3, BUBBLY))
    assert table.conversions == 802
    for name, scheme in by_name(table).items():
        errors = np.abs(decode(name, np.array(BUBBLY, dtype=bool)) - 3)
        assert scheme.rms_error_lsb == pytest.approx(np.sqrt(np.sum(errors**2) / 802))
        assert scheme.max_error_lsb == errors.max()
        assert scheme.wrong_word_rate == pytest.approx(np.sum(errors > 0) / 802)
        assert scheme.sparkle_rate == pytest.approx(np.sum(errors > 2) / 802)


def test_rom_turns_a_bubble_into_a_sparkle_and_the_ones_counter_does_not():
    schemes = by_name(compare_schemes(plan_of(3), words_of(3, BUBBLY[:1])))
    assert schemes["rom"].max_error_lsb == 3  # lines 2 and 4 make 6 of 3 ones
    assert schemes["ones-counter"].max_error_lsb == 0


def test_no_bubbles_leave_no_errors_and_say_so():
    table = compare_schemes(plan_of(3), words_of(3))
    assert all(scheme.rms_error_lsb == 0 for scheme in table.schemes)
    assert all(scheme.max_error_lsb == 0 for scheme in table.schemes)
    assert "cannot tell the schemes apart" in table.sentence


def test_no_conversions_at_all_are_no_error():
    table = compare_schemes(plan_of(3), words_of(3, clean=0))
    assert all(scheme.wrong_word_rate == 0 for scheme in table.schemes)


def test_three_readers_of_an_undecided_comparator_by_hand():
    words = words_of(2, undecided=[[1, 1, 0]], at=[2], weight=[1e-6])
    rom = by_name(compare_schemes(plan_of(2), words))["rom"]
    # The top decision of 110. Line 3 is that decision itself, read by both bits of the memory; the inverter that ends
    # line 2 is the third reader: eight readings.
    # Bit 0 = x, bit 1 = y OR line 2: line 2 is on while the inverter sees 0.
    codes = [x + 2 * (y | (1 - z)) for x in (0, 1) for y in (0, 1) for z in (0, 1)]
    errors = [min(abs(code - 2), abs(code - 3)) for code in codes]
    assert rom.undecided_exact
    assert rom.undecided_max_error_lsb == max(errors)
    assert rom.undecided_rms_error_lsb == pytest.approx(
        np.sqrt(np.mean(np.square(errors)))
    )
    assert rom.undecided_wrong_rate == pytest.approx(
        1e-6 * np.mean(np.array(errors) > 0)
    )


def test_undecided_words_count_by_their_weight():
    undecided = [[1, 1, 0, 0, 0, 0, 0], [1, 1, 1, 0, 0, 0, 0]]
    parts = [
        by_name(
            compare_schemes(
                plan_of(3), words_of(3, undecided=[row], at=[at], weight=[1.0])
            )
        )["rom"].undecided_rms_error_lsb
        for row, at in zip(undecided, (2, 3), strict=True)
    ]
    both = words_of(3, undecided=undecided, at=[2, 3], weight=[3e-6, 1e-6])
    mixed = by_name(compare_schemes(plan_of(3), both))["rom"].undecided_rms_error_lsb
    assert mixed**2 == pytest.approx(0.75 * parts[0] ** 2 + 0.25 * parts[1] ** 2)


def test_many_readers_are_called_inexact():
    # The middle decision of a 6-bit multiplexer tree drives 31 multiplexers and the top bit.
    word = np.arange(63) < 31
    words = words_of(6, undecided=[word], at=[31], weight=[1e-6])
    schemes = by_name(compare_schemes(plan_of(6), words))
    assert not schemes["mux-tree"].undecided_exact
    assert schemes["mux-tree"].undecided_max_error_lsb > 2
    assert schemes["ones-counter"].undecided_exact


def test_undecided_bit_itself_does_not_matter():
    tables = []
    for bit in (0, 1):
        word = [1, 1, bit, 0, 0, 0, 0]
        words = words_of(3, undecided=[word], at=[2], weight=[1.0])
        tables.append(compare_schemes(plan_of(3), words))
    assert tables[0] == tables[1]


def test_gray_logic_reads_each_decision_once_and_stays_legal():
    word = np.arange(31) < 10
    words = words_of(5, undecided=[word], at=[10], weight=[1.0])
    scheme = by_name(compare_schemes(plan_of(5), words))["gray-logic"]
    assert scheme.undecided_max_error_lsb == 0


def test_transitions_of_uniform_words_equal_a_long_random_record():
    rng = np.random.default_rng(2)
    words = words_of(3, BUBBLY, clean=1)
    table = by_name(compare_schemes(plan_of(3, gate_energy="1 fJ"), words))
    every = np.concatenate([np.tri(8, 7, -1).astype(bool), words.bubbly])
    record = every[rng.integers(0, 10, 40_000)]
    # The multiplexers of three bits: two on the halves, one on their middles.
    select = record[:, 3]
    outputs = [np.where(select, record[:, 4 + i], record[:, i]) for i in range(3)]
    outputs.append(np.where(outputs[1], outputs[2], outputs[0]))
    counted = sum(np.mean(out[1:] != out[:-1]) for out in outputs)
    # Four outputs, 40,000 pairs: one sigma of the sum is under 4 * 0.5 / 200.
    assert table["mux-tree"].transitions == pytest.approx(counted, abs=0.04)
    assert table["mux-tree"].energy == pytest.approx(
        1e-15 * table["mux-tree"].transitions
    )


def test_ranks_put_the_best_first():
    schemes = compare_schemes(plan_of(3), words_of(3, BUBBLY)).schemes
    by_error = rank(schemes, "error")
    assert by_error[0].rms_error_lsb == 0
    assert by_error[-1].rms_error_lsb == max(s.rms_error_lsb for s in schemes)
    assert rank(schemes, "depth")[0].depth == min(s.depth for s in schemes)
    assert rank(schemes, "energy")[0].transitions == min(s.transitions for s in schemes)


def test_table_is_plain_json_with_the_promised_keys():
    table = compare_schemes(plan_of(3), words_of(3, BUBBLY))
    rows = json.loads(json.dumps(table.to_dict()))["schemes"]
    for key in ("name", "gates", "depth", "rms_error_lsb", "max_error_lsb"):
        assert all(key in row for row in rows)
    for key in ("wrong_word_rate", "undecided_rms_error_lsb"):
        assert all(np.isfinite(row[key]) for row in rows)
    assert all(row["undecided_max_error_lsb"] == 0 for row in rows)


def test_the_sentence_names_the_cheapest_scheme_that_will_do():
    table = compare_schemes(plan_of(3), words_of(3, BUBBLY * 50, clean=1))
    good = [scheme for scheme in table.schemes if scheme.good_enough]
    cheapest = min(good, key=lambda scheme: scheme.transistors)
    assert f"is {cheapest.name}," in table.sentence
    assert not by_name(table)["rom"].good_enough
