"""Gain, offset and monotonicity of known curves."""

import numpy as np
import pytest

from flashplan.metrics.linearity import dnl_inl
from flashplan.metrics.transfer import falling_steps, gain_and_offset

PLACES = np.arange(1.0, 16.0)


@pytest.mark.parametrize("fit", ["endpoint", "best"])
def test_a_straight_line_gives_its_gain_and_offset(fit) -> None:
    gain, offset = 1.03, -0.4
    found = gain_and_offset((PLACES - offset) / gain - PLACES, fit)
    assert found.gain_error == pytest.approx(0.03, rel=1e-12)
    assert found.offset_lsb == pytest.approx(-0.4, rel=1e-12)


@pytest.mark.parametrize("fit", ["none", "endpoint", "best"])
def test_what_gain_and_offset_leave_is_the_linearity_error(fit) -> None:
    errors = np.random.default_rng(1).normal(scale=0.2, size=(4, 15))
    found = gain_and_offset(errors, fit)
    left = (
        (1 + found.gain_error[:, None]) * (PLACES + errors)
        + found.offset_lsb[:, None]
        - PLACES
    )
    _, inl = dnl_inl(errors, fit)
    np.testing.assert_allclose(left, inl, atol=1e-12)


def test_the_best_line_is_the_one_of_least_squares() -> None:
    errors = np.random.default_rng(2).normal(scale=0.2, size=15)
    slope, start = np.polyfit(PLACES, PLACES + errors, 1)
    found = gain_and_offset(errors, "best")
    assert found.gain_error == pytest.approx(1 / slope - 1, rel=1e-9)
    assert found.offset_lsb == pytest.approx(-start / slope, rel=1e-9)


def test_a_monotonic_curve_has_no_falling_step() -> None:
    assert falling_steps([0, 0, 1, 1, 2]).size == 0
