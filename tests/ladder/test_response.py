"""Two roads through time: exact modes, and steps with a controlled error."""

import numpy as np
import pytest

from flashplan.ladder import response
from flashplan.ladder.response import (
    charge_response,
    modal_response,
    stepped_response,
)
from tests.ladder.ladders import LAYOUTS, ladder_plan, reference_of


@pytest.mark.parametrize("bits", [4, 8])
@pytest.mark.parametrize("layout", LAYOUTS)
def test_steps_agree_with_modes_within_their_tolerance(layout: str, bits: int) -> None:
    # At 8 bits the two ends of a ringing ladder ring alike and hardly see each other.
    count = 2**bits - 1
    reference = reference_of(ladder_plan(bits, 9000.0, **LAYOUTS[layout]))
    charge = reference.taps.T @ np.full(count, 1e-15)
    times = np.array([1e-13, 5e-12, 6e-12, 1e-10, 1e-9])
    exact = modal_response(reference.network, charge, times)
    # The steps' tolerance is a part of this: the voltage that the charge starts with.
    start = 1e-15 / 15.3e-15
    for tolerance in (1e-5, 1e-8):
        found = stepped_response(reference.network, charge, times, tolerance)
        # A tap may hold a larger part of an error's energy than of the charge's, and some steps' errors add.
        assert np.abs(found - exact).max() < 20 * tolerance * start


def test_steps_are_of_fourth_order_and_end_at_their_last_stage() -> None:
    # Order conditions of a Runge-Kutta method; J. C. Butcher, any textbook.
    stages = len(response._STAGES)
    a = np.zeros((stages, stages))
    for index, row in enumerate(response._STAGES):
        a[index, :index] = row
        a[index, index] = response._DIAGONAL
    b, c = response._WEIGHTS, a.sum(axis=1)
    for weights, order in ((b, 4), (b - response._DIFFERENCE, 3)):
        conditions = [
            (weights.sum(), 1),
            (weights @ c, 1 / 2),
            (weights @ c**2, 1 / 3),
            (weights @ a @ c, 1 / 6),
            (weights @ c**3, 1 / 4),
            ((weights * c) @ a @ c, 1 / 8),
            (weights @ a @ c**2, 1 / 12),
            (weights @ a @ a @ c, 1 / 24),
        ]
        for found, wanted in conditions[: 8 if order == 4 else 4]:
            assert found == pytest.approx(wanted, abs=1e-12)
    np.testing.assert_array_equal(a[-1], b)  # stiffly accurate, hence L-stable


def test_the_road_taken_depends_on_inductance() -> None:
    times = np.array([1e-12, 1e-10])
    for layout, road in (("folded", modal_response), ("ringing", stepped_response)):
        reference = reference_of(ladder_plan(4, 500.0, **LAYOUTS[layout]))
        charge = reference.taps.T @ np.full(15, 1e-15)
        np.testing.assert_array_equal(
            charge_response(reference.network, charge, times),
            road(reference.network, charge, times),
        )
