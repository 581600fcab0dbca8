import numpy as np
import pytest
from scipy.stats import binom

from flashplan.metrics.intervals import (
    clopper_pearson_interval,
    quantile_interval,
    wilson_interval,
)


@pytest.mark.parametrize("share", [0.01, 0.3, 0.9])
def test_clopper_pearson_covers_at_least_its_confidence(share: float) -> None:
    chances = binom.pmf(np.arange(41), 40, share)
    inside = [
        low <= share <= high
        for low, high in (clopper_pearson_interval(k, 40, 0.9) for k in range(41))
    ]
    assert chances[inside].sum() >= 0.9


def test_wilson_lies_inside_clopper_pearson_where_it_matters() -> None:
    for k in (5, 50, 95):
        inner, outer = wilson_interval(k, 100), clopper_pearson_interval(k, 100)
        assert outer[0] < inner[0] < k / 100 < inner[1] < outer[1]


@pytest.mark.parametrize("count", [20, 200])
def test_quantile_interval_covers_the_true_quantile(count: int) -> None:
    generator = np.random.default_rng(8)
    hits = 0
    for _ in range(2000):
        _, low, high = quantile_interval(generator.random(count), 0.9, 0.9)
        hits += low < 0.9 < high
    assert hits / 2000 > 0.9 - 4 * (0.09 / 2000) ** 0.5


def test_a_small_sample_has_no_upper_end() -> None:
    middle, low, high = quantile_interval([1.0, 2.0, 3.0], 0.99)
    assert middle < 3.0 and high == np.inf and low <= 3.0


@pytest.mark.parametrize(("successes", "trials"), [(-1, 10), (11, 10), (0, 0)])
@pytest.mark.parametrize("interval", [wilson_interval, clopper_pearson_interval])
def test_impossible_counts_are_refused(interval, successes: int, trials: int) -> None:
    with pytest.raises(ValueError, match="successes"):
        interval(successes, trials)


@pytest.mark.parametrize("confidence", [0.0, 1.0, 2.0])
def test_impossible_confidences_are_refused(confidence: float) -> None:
    with pytest.raises(ValueError, match="confidence"):
        wilson_interval(1, 10, confidence)
    with pytest.raises(ValueError, match="confidence"):
        quantile_interval([1.0], 0.5, confidence)
