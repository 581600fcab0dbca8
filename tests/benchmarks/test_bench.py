"""Thousands of instances at once against scipy's solve_ivp called for each: a ratio within one run."""

import time

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from flashplan.cell.bench.setup import Setup, clock_drive, decide, reset_state
from flashplan.cell.circuit import build_network, slopes, with_mismatch
from flashplan.cell.mismatch import draw_mismatch
from flashplan.cell.process import load_process
from flashplan.cell.topology.double_tail import double_tail
from flashplan.cell.topology.sizes import Size

INSTANCES = 1000
SAMPLE = 10  # instances that solve_ivp is timed on


def example():
    process = load_process("generic-65nm")
    widths = {
        "tail": 3,
        "input": 5,
        "reset": 0.6,
        "second_tail": 5,
        "transfer": 1.5,
        "latch_n": 1.5,
        "latch_p": 2.5,
    }
    sizes = {name: Size(width * 1e-6, 60e-9) for name, width in widths.items()}
    network = build_network(double_tail(sizes, 1e-15), process, 1.2)
    setup = Setup(network, 0.78, 20e-12, 100e-12, 200e-12)
    generator = np.random.default_rng(2)
    parameters = with_mismatch(
        network.parameters,
        draw_mismatch(network.threshold_sigma, INSTANCES, generator),
        draw_mismatch(network.beta_sigma, INSTANCES, generator),
    )
    return setup, parameters, reset_state(setup, parameters, INSTANCES)


def one_by_one(setup, parameters, start, count):
    """Final states of the first instances from solve_ivp, at the bench's own accuracy."""
    ends = []
    length = setup.edge / 2 + setup.decision_time
    for k in range(count):
        single = type(parameters)(
            **{
                name: values[:, [k]] if values.shape[1] > 1 else values
                for name, values in vars(parameters).items()
            }
        )
        drive, _ = clock_drive(setup, np.array([20e-3]), 0.0, None)
        slope = slopes(setup.network, single, drive)
        found = solve_ivp(
            lambda t, v, slope=slope: slope(t, v[:, None])[:, 0],
            (0.0, length),
            start[:, k],
            rtol=1e-9,
            atol=1e-4 * setup.network.supply,
        )
        ends.append(found.y[:, -1])
    return np.array(ends).T


@pytest.mark.benchmark(group="transient bench")
def test_bench_is_twenty_times_faster_per_instance(benchmark):
    setup, parameters, start = example()
    began = time.perf_counter()
    reference = one_by_one(setup, parameters, start, SAMPLE)
    per_instance = (time.perf_counter() - began) / SAMPLE
    decision = benchmark.pedantic(
        decide, args=(setup, parameters, start, 20e-3), rounds=3, warmup_rounds=1
    )
    assert not decision.trajectory.failed.any()
    own = benchmark.stats.stats.min / INSTANCES
    print(f"\n{per_instance / own:.0f} times faster than solve_ivp per instance")
    assert per_instance / own >= 20
    # and it is the same answer: settled outputs to the accuracy asked of either
    end = decision.trajectory.voltages[-1][:, :SAMPLE]
    assert np.abs(end - reference).max() < 2e-3 * setup.network.supply
