"""Histogram tests of converters whose thresholds are known."""

import numpy as np
import pytest

from flashplan.metrics.histogram import (
    code_counts,
    missing_codes,
    ramp_histogram_samples,
    ramp_thresholds,
    sine_histogram_samples,
    sine_thresholds,
)
from flashplan.metrics.linearity import dnl_inl

BITS = 6
THRESHOLDS = np.arange(1, 64) + np.random.default_rng(2).normal(scale=0.1, size=63)


def test_a_ramp_finds_the_thresholds() -> None:
    ramp = np.linspace(-1, 65, 400_001)
    counts = code_counts(np.searchsorted(THRESHOLDS, ramp), BITS)
    np.testing.assert_allclose(
        ramp_thresholds(counts, -1, 65), THRESHOLDS, atol=66 / 400_000
    )


def test_a_coherent_sine_finds_the_thresholds() -> None:
    count = 2**18
    sine = 32 + 33 * np.sin(2 * np.pi * 12345 * np.arange(count) / count)
    counts = code_counts(np.searchsorted(THRESHOLDS, sine), BITS)
    np.testing.assert_allclose(
        sine_thresholds(counts, 33, 32), THRESHOLDS, atol=33 * 2 * np.pi / count
    )


def test_batches_are_measured_row_by_row() -> None:
    counts = np.random.default_rng(1).integers(1, 9, size=(3, 5, 8))
    together = sine_thresholds(counts, 1.0, 0.0)
    assert together.shape == (3, 5, 7)
    np.testing.assert_array_equal(together[2, 4], sine_thresholds(counts[2, 4], 1, 0))


def test_a_code_that_never_comes_is_missing_and_has_no_width() -> None:
    thresholds = np.array([1.0, 2.0, 2.0, 4.0, 5.0, 6.0, 7.0])
    ramp = np.linspace(0, 8, 80_001)
    counts = code_counts(np.searchsorted(thresholds, ramp), 3)
    assert missing_codes(counts).tolist() == [2]
    dnl, _ = dnl_inl(ramp_thresholds(counts, 0, 8) - np.arange(1, 8), "none")
    assert dnl[1] == pytest.approx(-1.0, abs=1e-9)


@pytest.mark.parametrize("confidence", [0.9, 0.99])
@pytest.mark.parametrize("stimulus", ["sine", "ramp"])
def test_the_sample_count_keeps_its_confidence(
    stimulus: str, confidence: float
) -> None:
    bits, tolerance, trials = 8, 0.1, 4000
    generator = np.random.default_rng(6)
    if stimulus == "sine":
        samples = sine_histogram_samples(bits, tolerance, confidence)
        share = np.diff(np.arcsin([0.0, 2.0 ** (1 - bits)]))[0] / np.pi
    else:
        samples = ramp_histogram_samples(bits, tolerance, confidence)
        share = 2.0**-bits
    hits = generator.binomial(samples, share, size=trials)
    within = np.mean(np.abs(hits / (samples * share) - 1) < tolerance)
    spread = np.sqrt(confidence * (1 - confidence) / trials)
    assert within == pytest.approx(confidence, abs=3 * spread + 0.002)


@pytest.mark.parametrize(
    "codes, message",
    [
        ([0, 1, 4], "sample 2 is 4; codes are whole numbers from 0 to 3"),
        ([0, -1], "sample 1 is -1"),
        ([0.0, 0.5], "sample 1 is 0.5"),
        ([0.0, float("nan")], "sample 1 is nan"),
    ],
)
def test_what_is_no_code_is_named(codes: list, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        code_counts(codes, 2)


def test_a_signal_inside_the_range_is_refused() -> None:
    for counts in ([0, 3, 3, 3], [3, 3, 3, 0]):
        with pytest.raises(ValueError, match="reach beyond the outer thresholds"):
            sine_thresholds(counts, 1, 0)
        with pytest.raises(ValueError, match="reach beyond the outer thresholds"):
            ramp_thresholds(counts, 0, 1)


@pytest.mark.parametrize("tolerance, confidence", [(0, 0.9), (0.1, 1), (0.1, 0)])
def test_impossible_wishes_are_refused(tolerance: float, confidence: float) -> None:
    with pytest.raises(ValueError, match="above zero"):
        sine_histogram_samples(8, tolerance, confidence)
