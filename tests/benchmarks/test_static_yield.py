"""Timed claims of the exact yield and the static run. Run with: pytest --benchmark-only tests/benchmarks"""

import math
import time
from collections.abc import Callable
from functools import partial

import numpy as np
import pytest

from flashplan.metrics.exact_yield import linearity_yield
from flashplan.metrics.offset_limit import largest_offset_sigma
from flashplan.metrics.static_run import draw_threshold_errors, judge_arrays


def shortest(work: Callable[[], object], repeats: int = 5) -> float:
    times = []
    for _ in range(repeats):
        begin = time.perf_counter()
        work()
        times.append(time.perf_counter() - begin)
    return min(times)


@pytest.mark.parametrize("bits", [4, 6, 8, 10, 12])
@pytest.mark.parametrize("fit", ["none", "endpoint", "best"])
def test_static_run_against_its_own_generator(benchmark, bits, fit) -> None:
    count, chunk = 2**bits - 1, max(128, 2**17 // 2**bits)
    chunks = max(1, 2**20 // count // chunk)
    generator = np.random.default_rng(1)

    def bare() -> None:
        for _ in range(chunks):
            generator.standard_normal((count, chunk))

    def whole() -> None:
        for _ in range(chunks):
            errors = draw_threshold_errors(generator, chunk, bits, 0.1)
            judge_arrays(errors, fit, 0.5, 0.5)

    benchmark(whole)
    # alternate, so that a busy machine weighs on both
    pairs = [(shortest(whole, 1), shortest(bare, 1)) for _ in range(15)]
    ratio = min(w for w, _ in pairs) / min(b for _, b in pairs)
    benchmark.extra_info["times the bare generator"] = round(ratio, 2)
    assert ratio < 1.6


@pytest.mark.parametrize("fit", ["none", "endpoint"])
def test_exact_yield_against_draws_of_equal_accuracy(benchmark, fit) -> None:
    sigma = largest_offset_sigma(8, 0.99, 0.5, 0.5, fit)
    accuracy = 1e-3  # relative, of the loss: what the exact yield promises at worst
    benchmark(linearity_yield, 8, sigma, 0.5, 0.5, fit)
    generator, arrays = np.random.default_rng(1), 20_000

    def draws() -> None:
        for _ in range(arrays // 200):
            errors = draw_threshold_errors(generator, 200, 8, sigma)
            judge_arrays(errors, fit, 0.5, 0.5)

    needed = 0.99 / 0.01 / accuracy**2
    time_of_draws = shortest(draws, 2) / arrays * needed
    exact = shortest(lambda: linearity_yield(8, sigma, 0.5, 0.5, fit))
    benchmark.extra_info["arrays needed"] = f"{needed:.2g}"
    benchmark.extra_info["draws take times"] = f"{time_of_draws / exact:.3g}"
    assert time_of_draws > 100 * exact


@pytest.mark.parametrize("fit", ["none", "endpoint", "best"])
@pytest.mark.parametrize("resistor_sigma", [0.0, 0.004])
def test_largest_offset_is_nearly_as_quick_at_twelve_bits_as_at_six(
    benchmark, fit, resistor_sigma
) -> None:
    def solve(bits: int) -> float:
        sigma = resistor_sigma * math.sqrt(64 / 2**bits)
        return largest_offset_sigma(bits, 0.99, 0.5, 0.5, fit, sigma)

    benchmark(solve, 6)
    times = {bits: shortest(partial(solve, bits), 2) for bits in (4, 6, 8, 10, 12)}
    for bits, seconds in times.items():
        benchmark.extra_info[f"{bits} bits, ms"] = round(seconds * 1e3, 1)
    assert times[12] < 6 * times[6]
