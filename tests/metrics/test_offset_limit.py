import math

import numpy as np
import pytest

from flashplan.metrics.exact_yield import linearity_yield
from flashplan.metrics.linearity import FITS
from flashplan.metrics.offset_limit import (
    YieldUnreachable,
    largest_mismatch_scale,
    largest_offset_sigma,
)


@pytest.mark.parametrize("fit", FITS)
@pytest.mark.parametrize("bits", [2, 6, 12])
@pytest.mark.parametrize("goal", [0.5, 0.997, 1 - 1e-8])
def test_the_limit_meets_its_own_yield(fit: str, bits: int, goal: float) -> None:
    sigma = largest_offset_sigma(bits, goal, 0.5, 0.5, fit)
    loss = linearity_yield(bits, sigma, 0.5, 0.5, fit).loss
    assert math.isclose(loss, 1 - goal, rel_tol=1e-6)


@pytest.mark.parametrize("goal", [1e-6, 0.02])
def test_the_limit_of_a_small_yield(goal: float) -> None:
    sigma = largest_offset_sigma(6, goal, 0.5, 0.5, "none")
    found = linearity_yield(6, sigma, 0.5, 0.5, "none").yield_
    assert math.isclose(found, goal, rel_tol=1e-6)


@pytest.mark.parametrize("fit", FITS)
def test_resistors_and_systematic_errors_cost_offset(fit: str) -> None:
    bow = 0.1 * np.sin(np.linspace(0, np.pi, 15))
    free = largest_offset_sigma(4, 0.99, 0.5, 0.45, fit)
    resistors = largest_offset_sigma(4, 0.99, 0.5, 0.45, fit, 0.03)
    both = largest_offset_sigma(4, 0.99, 0.5, 0.45, fit, 0.03, bow)
    assert both < resistors < free
    loss = linearity_yield(4, both, 0.5, 0.45, fit, 0.03, bow).loss
    assert math.isclose(loss, 0.01, rel_tol=1e-6)


def test_no_offset_rescues_a_bad_string() -> None:
    with pytest.raises(YieldUnreachable, match="out of reach") as caught:
        largest_offset_sigma(6, 0.99, 0.5, 0.5, "none", 0.06)
    drawn = linearity_yield(6, 0.0, 0.5, 0.5, "none", 0.06).yield_
    assert caught.value.yield_at_zero == drawn < 0.99


def test_no_offset_rescues_a_bow_beyond_the_goal() -> None:
    bow = 0.6 * np.sin(np.linspace(0, np.pi, 63))
    with pytest.raises(YieldUnreachable) as caught:
        largest_offset_sigma(6, 0.99, 0.5, 0.5, "endpoint", 0.0, bow)
    assert caught.value.yield_at_zero == 0.0


@pytest.mark.parametrize("fit", FITS)
def test_a_common_scale_shares_the_yield(fit: str) -> None:
    scale = largest_mismatch_scale(5, 0.99, 0.5, 0.5, fit, 0.2, 0.01)
    loss = linearity_yield(5, 0.2 * scale, 0.5, 0.5, fit, 0.01 * scale).loss
    assert math.isclose(loss, 0.01, rel_tol=1e-6)
    alone = largest_offset_sigma(5, 0.99, 0.5, 0.5, fit)
    without = largest_mismatch_scale(5, 0.99, 0.5, 0.5, fit, 0.2, 0.0)
    assert math.isclose(0.2 * without, alone, rel_tol=1e-7)
    assert scale < without


@pytest.mark.parametrize("goal", [0.0, 1.0, -0.1, math.nan])
def test_a_yield_that_is_no_part_is_refused(goal: float) -> None:
    with pytest.raises(ValueError, match="yield goal"):
        largest_offset_sigma(6, goal, 0.5, 0.5, "none")
    with pytest.raises(ValueError, match="yield goal"):
        largest_mismatch_scale(6, goal, 0.5, 0.5, "none", 1.0, 0.1)


def test_without_goals_there_is_no_limit() -> None:
    with pytest.raises(ValueError, match="neither"):
        largest_offset_sigma(6, 0.99, math.inf, math.inf, "none")


@pytest.mark.parametrize("parts", [(0.0, 0.1), (-1.0, 0.1), (0.1, -0.1)])
def test_parts_out_of_range_are_refused(parts: tuple[float, float]) -> None:
    with pytest.raises(ValueError, match="part"):
        largest_mismatch_scale(6, 0.99, 0.5, 0.5, "none", *parts)
