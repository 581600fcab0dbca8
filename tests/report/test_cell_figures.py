"""Figures of a cell show the numbers that they are given."""

import numpy as np
import pytest

from flashplan.cell.bench.offset import describe_offsets
from flashplan.cell.bench.regeneration import DelayCurve, Regeneration
from flashplan.cell.bench.transfer import TripPoints
from flashplan.cell.sized import SizedCell, SizedDevice
from flashplan.plan.datasheet import Datasheet
from flashplan.report.cell_figures import (
    contribution_figure,
    delay_figure,
    offset_figure,
    trip_figure,
)


def test_delay_points_and_law_are_drawn_in_picoseconds():
    curve = DelayCurve(np.array([1e-3, 1e-2]), np.array([40e-12, 25e-12]), 0)
    law = Regeneration(6e-12, 5.9e-12, 6.1e-12, 2.0, 10e-12)
    (axes,) = delay_figure(curve, law, 0.5).axes
    drawn_law, points = axes.get_lines()
    assert points.get_ydata() == pytest.approx([40.0, 25.0])
    assert drawn_law.get_ydata()[0] == pytest.approx(10 + 6 * np.log(0.5 / 2e-3))


def test_trip_loop_turns_at_the_mean_trip_points_without_failed_draws():
    trips = TripPoints(
        np.array([0.04, 0.06, 9.0]),
        np.array([-0.03, -0.05, 9.0]),
        np.array([False, False, True]),
    )
    (axes,) = trip_figure(trips, 5.0).axes
    rising, _, falling, _ = axes.get_lines()
    assert rising.get_xdata()[1] == pytest.approx(50.0)
    assert falling.get_xdata()[1] == pytest.approx(-40.0)


def test_offset_histogram_holds_every_good_draw():
    draws = np.random.default_rng(1).normal(0, 1e-3, 500)
    none = np.zeros(500, dtype=bool)
    (axes,) = offset_figure(describe_offsets(draws, none, none, 1e-6)).axes
    assert sum(bar.get_height() for bar in axes.patches) == 500


def test_contributions_of_each_kind_sum_to_the_whole():
    devices = tuple(
        SizedDevice(name, 2, 1e-6, 6e-8, "energy", part * 1e-3, part * 1e-4, part)
        for name, part in (("input", 3.0), ("latch_n", 1.0))
    )
    cell = SizedCell("single-tail", "generic", True, Datasheet(), {}, devices)
    for axes in contribution_figure(cell).axes:
        assert sum(bar.get_width() for bar in axes.patches) == pytest.approx(100.0)
