"""Two roads through time: exact modes, and steps with a controlled error."""

import numpy as np
import pytest

from flashplan.ladder.response import (
    charge_response,
    modal_response,
    stepped_response,
)
from tests.ladder.ladders import LAYOUTS, ladder_plan, reference_of


@pytest.mark.parametrize("layout", LAYOUTS)
def test_steps_agree_with_modes_within_their_tolerance(layout: str) -> None:
    reference = reference_of(ladder_plan(5, 2000.0, **LAYOUTS[layout]))
    charge = reference.taps.T @ np.full(31, 1e-15)
    times = np.array([1e-13, 5e-12, 6e-12, 1e-10, 1e-9])
    exact = modal_response(reference.network, charge, times)
    errors = [
        np.abs(stepped_response(reference.network, charge, times, tolerance) - exact)
        for tolerance in (1e-4, 1e-7)
    ]
    start = 1e-15 / reference.network.capacitance.diagonal().max(initial=30e-15)
    start = max(start, np.abs(exact).max())
    assert errors[1].max() < 3e-5 * start
    assert errors[1].max() < errors[0].max()


def test_the_road_taken_depends_on_inductance() -> None:
    times = np.array([1e-12, 1e-10])
    for layout, road in (("folded", modal_response), ("ringing", stepped_response)):
        reference = reference_of(ladder_plan(4, 500.0, **LAYOUTS[layout]))
        charge = reference.taps.T @ np.full(15, 1e-15)
        np.testing.assert_array_equal(
            charge_response(reference.network, charge, times),
            road(reference.network, charge, times),
        )
