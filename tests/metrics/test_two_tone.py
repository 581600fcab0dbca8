"""Two tones through known distortion."""

import numpy as np
import pytest

from flashplan.metrics.two_tone import two_tone_metrics

SAMPLES = 4096
PHASE = 2 * np.pi * np.arange(SAMPLES) / SAMPLES
TONES = 0.5 * np.cos(401 * PHASE) + 0.5 * np.cos(463 * PHASE + 1)


def test_a_polynomial_makes_the_products_of_the_textbook() -> None:
    # a2 x^2 puts a2 A^2 at f2 +- f1; a3 x^3 puts (3/4) a3 A^3 at 2 f1 - f2 and adds (9/4) a3 A^3 to each tone.
    square, cube, amplitude = 0.003, 0.02, 0.5
    found = two_tone_metrics(TONES + square * TONES**2 + cube * TONES**3, 401, 463)
    tone = amplitude + 2.25 * cube * amplitude**3
    second = square * amplitude**2
    third = 0.75 * cube * amplitude**3
    assert found.first_power == pytest.approx(tone**2 / 2, rel=1e-9)
    assert found.second_power == pytest.approx(tone**2 / 2, rel=1e-9)
    assert found.imd2_db == pytest.approx(20 * np.log10(second / tone), abs=1e-6)
    assert found.imd3_db == pytest.approx(20 * np.log10(third / tone), abs=1e-6)


def test_all_but_the_tones_is_error() -> None:
    noise = np.random.default_rng(1).normal(scale=0.01, size=SAMPLES)
    found = two_tone_metrics(TONES + noise, 401, 463)
    # Two tones of 1/8 against 1e-4; the power of n samples of noise scatters by sqrt(2/n).
    assert found.sndr_db == pytest.approx(10 * np.log10(0.25 / 1e-4), abs=0.3)


@pytest.mark.parametrize(
    "one, two", [(401, 401), (401, 802), (300, 1024), (0, 5), (2048, 5), (400, 1200)]
)
def test_tones_that_fall_on_their_products_are_refused(one: int, two: int) -> None:
    with pytest.raises(ValueError, match="share a bin"):
        two_tone_metrics(TONES, one, two)


def test_a_missing_tone_is_told() -> None:
    with pytest.raises(ValueError, match="missing"):
        two_tone_metrics(np.zeros(SAMPLES), 401, 463)
