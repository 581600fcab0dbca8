"""Speed of the reference ladder, beside dense numpy on the same network. Run with: pytest --benchmark-only"""

import time

import numpy as np
import pytest

from flashplan.ladder import disturbance, kickback_memory, solve_ladder
from flashplan.ladder.network import dc_voltages
from flashplan.plan import Plan
from tests.ladder.ladders import LAYOUTS, ladder_plan, reference_of

EFFECTS = {
    "end_resistance": 0.1,
    "bias_current": "1 nA",
    "resistor_sigma": 0.003,
    "gradient_linear": 0.01,
}


def dense_effects(plan: Plan) -> np.ndarray:
    """Rest, feedthrough and kickback at rest of the same network by dense matrices; the kickback per tap in LSB."""
    reference = reference_of(plan)
    network, cell = reference.network, plan.datasheet
    conductance = network.conductance.toarray()
    capacitance = network.capacitance.toarray()
    np.linalg.solve(conductance, np.ones(conductance.shape[0]))
    turn = 2j * np.pi * plan.converter.input_frequency
    np.linalg.solve(conductance + turn * capacitance, np.ones(conductance.shape[0]))
    root = np.sqrt(capacitance.diagonal())
    rate, shape = np.linalg.eigh(conductance / root[:, None] / root)
    shape /= root[:, None]
    left = np.exp(-rate / plan.converter.sample_rate)
    answer = (shape * (left / (1 - left))) @ shape.T
    count = plan.comparators
    sign = np.sign(np.arange(count)[:, None] - np.arange(count))
    charge = cell.kickback_charge
    assert charge is not None
    taps = reference.taps.toarray()
    return ((taps @ answer @ taps.T) * sign).sum(axis=1) * charge / plan.lsb


@pytest.mark.parametrize("layout", LAYOUTS)
def test_all_effects_at_10_bits_in_two_seconds(benchmark, layout):
    plan = ladder_plan(10, 3000.0, **{**EFFECTS, **LAYOUTS[layout]})
    benchmark.pedantic(solve_ladder, (plan,), rounds=3, warmup_rounds=1)
    assert benchmark.stats.stats.min < 2.0


def test_all_effects_at_10_bits_beside_dense_numpy(benchmark):
    plan = ladder_plan(10, 3000.0, **{**EFFECTS, "end_resistance": 0})
    start = time.perf_counter()
    dense = dense_effects(plan)
    benchmark.extra_info["dense_seconds"] = time.perf_counter() - start
    result = benchmark.pedantic(solve_ladder, (plan,), rounds=3, warmup_rounds=1)
    np.testing.assert_allclose(result.kickback_lsb, dense, atol=1e-6 * abs(dense).max())
    ratio = benchmark.extra_info["dense_seconds"] / benchmark.stats.stats.min
    benchmark.extra_info["times_faster_than_dense"] = ratio
    assert ratio > 1


def test_taps_at_rest_beside_dense_numpy(benchmark):
    network = reference_of(ladder_plan(12, 3000.0, **EFFECTS)).network
    found = benchmark(dc_voltages, network)
    source = network.conductance_to @ network.held_voltages() - network.drawn
    dense = network.conductance.toarray()
    start = time.perf_counter()
    expected = np.linalg.solve(dense, source)
    ratio = (time.perf_counter() - start) / benchmark.stats.stats.min
    benchmark.extra_info["times_faster_than_dense"] = ratio
    np.testing.assert_allclose(found, expected, rtol=1e-8)
    assert ratio > 3


@pytest.mark.parametrize("resistance", [300.0, 3000.0, 30_000.0])
def test_kickback_of_65536_samples_at_8_bits_in_two_seconds(benchmark, resistance):
    plan = ladder_plan(8, resistance)
    phase = 2 * np.pi * np.arange(65536) * 12345 / 65536
    codes = np.clip(np.round(128 + 127.5 * np.sin(phase)), 0, 255).astype(int)

    def run():
        memory = kickback_memory(plan, plan.datasheet)
        return memory, disturbance(memory, codes, codes - 4, 10)[0]

    memory, moved = benchmark.pedantic(run, rounds=3, warmup_rounds=1)
    benchmark.extra_info["modes"] = memory.decay.size
    assert benchmark.stats.stats.min < 2.0
    # A march with the dense matrix of one period, over a hundredth of the samples.
    network = reference_of(plan).network
    capacitance = network.capacitance.diagonal()
    root = np.sqrt(capacitance)
    rate, shape = np.linalg.eigh(network.conductance.toarray() / root[:, None] / root)
    step = (shape * np.exp(-rate / plan.converter.sample_rate)) @ shape.T
    step = step / root[:, None] * root
    part = 655
    start = time.perf_counter()
    state, last = np.zeros(255), []
    for code in codes[:part]:
        last.append(state)
        sign = np.where(np.arange(255) < code, 1.0, -1.0)
        state = step @ (state + sign * plan.datasheet.kickback_charge / capacitance)
    seconds = (time.perf_counter() - start) * 65536 / part
    benchmark.extra_info["times_faster_than_a_dense_march"] = (
        seconds / benchmark.stats.stats.min
    )
    column = codes[:part, None] - 5 + np.arange(10)
    there = (column >= 0) & (column < 255)
    expected = np.take_along_axis(np.array(last), np.clip(column, 0, 254), axis=1)
    scale = np.abs(expected).max() / plan.lsb
    np.testing.assert_allclose(
        moved[:part][there], expected[there] / plan.lsb, atol=1e-6 * scale
    )
