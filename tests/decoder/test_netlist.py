"""What is read off a netlist, by hand on a small one."""

import numpy as np

from flashplan.decoder.evaluate import (
    compile_netlist,
    evaluate,
    pack,
    run,
    run_all,
    split_readers,
    unpack_codes,
)
from flashplan.decoder.netlist import Builder, depth, fan_out, gate_total, transistors
from flashplan.decoder.schemes import SCHEMES


def small():
    b = Builder(2)
    low = b.gate("and", b.t(1), b.gate("not", b.t(2)))
    return b.finish("small", [b.gate("or", low, b.t(3)), b.t(2)])


def test_costs_of_a_small_netlist_by_hand():
    netlist = small()
    assert gate_total(netlist) == 3
    assert depth(netlist) == 3
    # An inverter of 2, two gates of 6.
    assert transistors(netlist) == 14
    assert fan_out(netlist)["t2"] == 2  # the inverter and word bit 1


def test_unused_gates_are_left_out():
    b = Builder(2)
    b.gate("not", b.t(1))
    assert gate_total(b.finish("wires", [b.t(1), b.t(2)])) == 0


def test_packing_any_number_of_words_gives_them_back():
    rng = np.random.default_rng(4)
    for count in (0, 1, 63, 64, 65, 511, 513, 1300):
        words = rng.random((count, 5)) < 0.5
        expected = words @ (1 << np.arange(5))
        assert np.array_equal(unpack_codes(pack(words), count), expected)


def test_one_boolean_a_byte_gives_the_same_as_64_to_a_word():
    rng = np.random.default_rng(5)
    words = rng.random((3000, 31)) < 0.5
    for scheme in SCHEMES.values():
        program = compile_netlist(scheme.build(5))
        bits = run(program, np.ascontiguousarray(words.T))
        assert np.array_equal(
            (1 << np.arange(5)) @ bits.astype(np.int64), evaluate(program, words)
        )


def test_rows_in_use_again_give_the_same_as_a_row_for_every_net():
    rng = np.random.default_rng(6)
    lanes = pack(rng.random((500, 63)) < 0.5)
    for scheme in SCHEMES.values():
        program = compile_netlist(scheme.build(6))
        rows = run_all(program, lanes)
        assert np.array_equal(run(program, lanes), [rows[r] for r in program.outputs])


def test_split_readers_agree_with_the_netlist_when_they_see_the_same():
    rng = np.random.default_rng(7)
    words = rng.random((400, 31)) < 0.5
    for scheme in SCHEMES.values():
        netlist = scheme.build(5)
        program = compile_netlist(netlist)
        split, origin = split_readers(program)
        reads = fan_out(netlist)
        expected = [reads[net] for net in netlist.inputs]
        assert np.bincount(origin).tolist() == expected
        assert np.array_equal(
            evaluate(split, words[:, origin]), evaluate(program, words)
        )
