"""Bench measurements: books that must balance, symmetry, memory, failures counted."""

from dataclasses import replace

import numpy as np
import pytest

from flashplan.cell.bench.aperture import measure_aperture
from flashplan.cell.bench.cycle import measure_cycle
from flashplan.cell.bench.memory import measure_memory
from flashplan.cell.bench.offset import bisect_offset, describe_offsets
from flashplan.cell.bench.pulse import chatter
from flashplan.cell.bench.regeneration import delay_curve, measure_regeneration
from flashplan.cell.bench.setup import Setup, decide, reset_state
from flashplan.cell.circuit import build_network, with_mismatch
from flashplan.cell.linearised import linearise
from flashplan.cell.process import at_corner, at_temperature, load_process
from flashplan.cell.topology.preamp_latch import preamp_latch
from flashplan.cell.topology.single_tail import single_tail
from flashplan.cell.topology.sizes import Size
from flashplan.errors import InputError
from tests.published.test_comparator_cell import three_stage_setup

WIDTHS = {"tail": 3, "input": 5, "latch_n": 2.5, "latch_p": 2.5, "reset": 0.6}


def sizes(**changes):
    return {
        name: Size(width * 1e-6, 60e-9) for name, width in (WIDTHS | changes).items()
    }


def cell(process=None, reset_time=200e-12, **changes):
    process = load_process("generic-65nm") if process is None else process
    network = build_network(single_tail(sizes(**changes), 1e-15), process, 1.2)
    return Setup(network, 0.78, 20e-12, 200e-12, reset_time)


def test_a_balanced_cell_stays_balanced_and_decides_by_the_sign():
    setup = cell()
    start = np.repeat(reset_state(setup, setup.network.parameters, 1), 3, 1)
    output = decide(setup, setup.network.parameters, start, [-1e-3, 0.0, 1e-3]).output
    assert output[-1, 0] < -1.1 < 1.1 < output[-1, 2]
    assert output[-1, 0] == pytest.approx(-output[-1, 2], abs=1e-3)
    # rounding itself regenerates: 1e-16 V grows by exp(200 ps / tau)
    assert abs(output[-1, 1]) < 10e-3


def test_energy_drawn_equals_energy_burnt_in_devices_and_clock():
    cycle = measure_cycle(cell())
    assert cycle.failed == 0
    assert cycle.device_energy.sum() + cycle.clock_energy == pytest.approx(
        cycle.energy, rel=0.03
    )


def test_kickback_grows_with_the_input_pair():
    small, large = measure_cycle(cell()), measure_cycle(cell(input=10))
    assert large.kickback > 1.5 * small.kickback
    assert large.common_kickback > 1.5 * small.common_kickback


def test_memory_vanishes_with_a_long_reset():
    short, long = measure_memory(cell(reset_time=30e-12)), measure_memory(cell())
    assert short > 10 * long


def test_bisection_finds_a_known_offset():
    # two thresholds apart are an offset of their difference at the input
    setup = cell()
    names = [device.name for device in setup.network.circuit.devices]
    shift = np.zeros((len(names), 1))
    shift[names.index("input_a")] = 4e-3
    shift[names.index("input_b")] = -4e-3
    parameters = with_mismatch(setup.network.parameters, shift, np.zeros((1, 1)))
    start = reset_state(setup, parameters, 1)
    found, failed, outside = bisect_offset(setup, parameters, start, 20e-3, 1e-5)
    assert not failed.any()
    assert not outside.any()
    assert found[0] == pytest.approx(8e-3, abs=1e-4)


def test_an_offset_beyond_the_search_is_counted_not_dropped():
    described = describe_offsets(
        np.array([1e-3, -1e-3, 0.0, 9.0, 9.0]),
        np.array([False, False, False, True, False]),
        np.array([False, False, False, False, True]),
        1e-5,
    )
    assert (described.offsets.size, described.failed, described.unbracketed) == (
        3,
        1,
        1,
    )
    assert described.low < described.sigma < described.high


def test_an_instance_that_cannot_be_integrated_is_reported():
    setup = cell()
    shift = np.zeros((11, 3))
    shift[1, 1] = np.nan
    parameters = with_mismatch(setup.network.parameters, shift, np.zeros((1, 3)))
    start = np.repeat(reset_state(setup, setup.network.parameters, 1), 3, 1)
    decision = decide(setup, parameters, start, 5e-3)
    assert decision.trajectory.failed.tolist() == [False, True, False]
    assert decision.output[-1, [0, 2]] == pytest.approx(1.2, abs=0.01)


def test_corners_and_temperatures_run_as_instances():
    base = load_process("generic-65nm")
    processes = [
        at_corner(base, "slow", "slow"),
        base,
        at_corner(base, "fast", "fast"),
        at_temperature(base, 400.0),
    ]
    setup = cell(processes)
    start = reset_state(setup, setup.network.parameters, 4)
    output = decide(setup, setup.network.parameters, start, 1e-3, time=45e-12).output
    slow, typical, fast, hot = output[-1]
    assert slow < typical < fast
    assert hot < typical


def test_sampling_instant_and_skew_agree_with_the_linearised_cell():
    setup = cell()
    aperture = measure_aperture(setup)
    assert aperture.instant == pytest.approx(linearise([setup]).instant[0], abs=0.5e-12)
    assert 0 < aperture.skew_sigma < 5e-12


def test_linearised_cell_agrees_with_the_transient():
    setup = cell()
    cheap, dear = linearise([setup]), measure_regeneration(setup, 2e-9)
    assert cheap.tau[0] == pytest.approx(dear.tau, rel=0.01)
    # gain and delay trade against each other; what counts is the instant of a valid output
    instants = [
        delay + tau * np.log(setup.valid_level / (gain * 1e-6))
        for delay, tau, gain in (
            (cheap.delay[0], cheap.tau[0], cheap.gain[0]),
            (dear.delay, dear.tau, dear.gain),
        )
    ]
    assert instants[0] == pytest.approx(instants[1], rel=0.02)


def test_a_tighter_tolerance_changes_no_delay():
    setup = cell()
    loose = delay_curve(setup, [1e-2, 1e-4], 2e-9)
    tight = delay_curve(replace(setup, tolerance=1e-7), [1e-2, 1e-4], 2e-9)
    assert loose.delay == pytest.approx(tight.delay, abs=0.3e-12)


def test_a_preamplifier_draws_static_power_and_quiets_the_input():
    process = load_process("generic-65nm")
    network = build_network(
        preamp_latch(sizes(bias=3, preamp=5), 1e-15, 3e3), process, 1.2
    )
    setup = Setup(network, 0.78, 20e-12, 200e-12, 200e-12, bias=0.5, lead=150e-12)
    quiet, bare = measure_cycle(setup), measure_cycle(cell())
    assert quiet.static_power > 50 * bare.static_power
    assert quiet.common_kickback < 0.5 * bare.common_kickback


def test_a_missing_group_of_devices_is_named():
    wrong = sizes()
    del wrong["reset"]
    with pytest.raises(InputError, match="reset"):
        single_tail(wrong, 1e-15)


def test_hysteresis_stops_the_chatter_of_a_slow_noisy_input():
    counts = [
        chatter(
            three_stage_setup(ratio),
            100e-3,
            1.0e-6,
            20e-3,
            12e6,
            3,
            np.random.default_rng(1),
        )
        for ratio in (0.8, 1.6)
    ]
    assert counts[0].failed == counts[1].failed == 0
    assert counts[0].transitions.max() > 1
    assert counts[1].transitions.tolist() == [1, 1, 1]
