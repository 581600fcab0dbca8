"""Error power of staircases."""

import numpy as np
import pytest
from scipy.stats import arcsine, uniform

from flashplan.metrics.staircase import staircase_error_power


def test_a_moved_threshold_adds_its_square() -> None:
    # A threshold moved by e adds e^2 of mean square error per LSB of range: the rule by which error powers add.
    thresholds = np.arange(1.0, 8.0)
    moved = thresholds + np.random.default_rng(1).normal(scale=0.2, size=7)
    levels = np.arange(8) + 0.5
    added = 8 * (
        staircase_error_power(np.sort(moved), levels, uniform(0, 8))
        - staircase_error_power(thresholds, levels, uniform(0, 8))
    )
    assert added == pytest.approx(np.sum((moved - thresholds) ** 2), rel=1e-6)


def test_a_sine_sees_what_a_dense_record_sees() -> None:
    thresholds, levels = np.arange(1.0, 16.0), np.arange(16) + 0.5
    phase = (np.arange(400_000) + 0.5) / 400_000 * 2 * np.pi
    sine = 8 + 8 * np.sin(phase)
    record = np.mean((levels[np.searchsorted(thresholds, sine)] - sine) ** 2)
    power = staircase_error_power(thresholds, levels, arcsine(0, 16))
    assert power == pytest.approx(record, rel=1e-4)


def test_a_staircase_that_falls_is_refused() -> None:
    with pytest.raises(ValueError, match="must not fall"):
        staircase_error_power([2, 1], [0, 1, 2], uniform(0, 3))
    with pytest.raises(ValueError, match="one level more"):
        staircase_error_power([1, 2], [0, 1], uniform(0, 3))
