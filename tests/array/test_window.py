"""The windowed conversion against the dense one, which knows no window."""

import numpy as np
import pytest

from flashplan.array.window import Comparators, Decisions, Signal, convert, reach
from tests.array.dense import convert_densely


def sine(bits: int, samples: int, cycles: int) -> Signal:
    half = 2.0 ** (bits - 1)
    phase = (
        2 * np.pi * cycles * np.arange(samples) / samples + 0.123
    )  # off every threshold
    return Signal(half + half * np.sin(phase), half * np.cos(phase), phase)


def array(
    bits: int,
    seed: int,
    spread: float,
    noise: float = 0.0,
    hysteresis: float = 0.0,
    sway: float = 0.0,
) -> Comparators:
    draw = np.random.default_rng(seed)
    count = 2**bits - 1
    return Comparators(
        thresholds=np.arange(1, count + 1) + spread * draw.standard_normal(count),
        skew=spread * draw.standard_normal(count) / 2**bits,
        noise=noise,
        hysteresis=hysteresis,
        undecided=0.0,
        sway=sway * draw.standard_normal(count) * np.exp(1j) if sway else None,
    )


def whole(decisions: Decisions, samples: int) -> np.ndarray:
    return decisions.words(np.arange(samples))


@pytest.mark.parametrize("bits", [2, 3, 6])
@pytest.mark.parametrize("spread", [0.0, 0.3, 2.0])
@pytest.mark.parametrize("hysteresis", [0.0, 0.4, 3.0])
@pytest.mark.parametrize("cycles", [1, 37, 499])
def test_without_noise_every_decision_is_that_of_the_dense_array(
    bits: int, spread: float, hysteresis: float, cycles: int
) -> None:
    signal = sine(bits, 1000, cycles)
    comparators = array(bits, bits, spread, hysteresis=hysteresis, sway=spread / 4)
    generator = np.random.default_rng(0)
    found = convert(signal, comparators, generator, reach(comparators, signal))
    dense = convert_densely(signal, comparators, generator)
    np.testing.assert_array_equal(whole(found, 1000), dense)
    np.testing.assert_array_equal(found.ones(), dense.sum(axis=1))


def test_blocks_remember_what_came_before() -> None:
    signal = sine(5, 1200, 3)
    comparators = array(5, 1, 0.3, hysteresis=1.5)
    generator = np.random.default_rng(0)
    half = reach(comparators, signal)
    at_once = convert(signal, comparators, generator, half).ones()
    before, codes = None, []
    for part in np.array_split(np.arange(1200), 7):
        block = Signal(signal.value[part], signal.slope[part], signal.phase[part])
        before = convert(block, comparators, generator, half, before)
        codes.append(before.ones())
    np.testing.assert_array_equal(np.concatenate(codes), at_once)


def test_with_noise_the_statistics_are_those_of_the_dense_array() -> None:
    bits, samples = 5, 20_000
    signal = sine(bits, samples, 4999)
    comparators = array(bits, 3, 0.4, noise=0.5, hysteresis=0.3)
    found = convert(
        signal, comparators, np.random.default_rng(1), reach(comparators, signal)
    )
    dense = convert_densely(signal, comparators, np.random.default_rng(2))
    ideal = signal.value - 0.5
    power = [
        np.mean((codes - ideal) ** 2) for codes in (found.ones(), dense.sum(axis=1))
    ]
    spread = np.std((dense.sum(axis=1) - ideal) ** 2) / np.sqrt(samples)
    assert abs(power[0] - power[1]) < 4 * np.sqrt(2) * spread
    rates = [
        found.bubbly().size / samples,
        np.mean((dense[:, 1:] & ~dense[:, :-1]).any(axis=1)),
    ]
    assert abs(rates[0] - rates[1]) < 4 * np.sqrt(
        2 * rates[1] * (1 - rates[1]) / samples
    )


def test_a_word_is_bubbly_when_a_threshold_is_passed_above_one_that_is_not() -> None:
    decisions = Decisions(
        np.array([1, 1, 1]), np.array([[1, 1, 0], [1, 0, 1], [0, 1, 0]], dtype=bool), 3
    )
    np.testing.assert_array_equal(decisions.bubbly(), [1, 2])


def test_an_undecided_comparator_falls_either_way_equally_often() -> None:
    samples = 10_000
    signal = Signal(np.full(samples, 2.0), np.zeros(samples), np.zeros(samples))
    comparators = Comparators(
        np.array([1.0, 2.0, 3.0]), np.zeros(3), 0.0, 0.0, undecided=0.01
    )
    ones = convert(
        signal, comparators, np.random.default_rng(0), reach(comparators, signal)
    ).ones()
    assert set(np.unique(ones)) == {1, 2}
    assert abs(np.mean(ones == 2) - 0.5) < 4 * 0.5 / np.sqrt(samples)
