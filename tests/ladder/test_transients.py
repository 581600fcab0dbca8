"""The ladder in time: what the figures show is what the numbers say."""

import numpy as np
import pytest
from scipy.linalg import expm

from flashplan.ladder import solve_ladder
from flashplan.ladder.transients import code_step, worst_disturbance
from tests.ladder.ladders import LAYOUTS, dense_system, ladder_plan, reference_of


@pytest.mark.parametrize("layout", ["straight", "folded and ringing"])
def test_the_worst_tap_repeats_and_ends_where_the_decision_finds_it(
    layout: str,
) -> None:
    plan = ladder_plan(5, 9000.0, **LAYOUTS[layout])
    found = worst_disturbance(plan, plan.datasheet, 9000.0)
    kickback = solve_ladder(plan).kickback_lsb
    assert found is not None
    assert kickback is not None
    assert np.abs(kickback[found.tap - 1]) == np.abs(kickback).max()
    assert found.decision_lsb == pytest.approx(kickback[found.tap - 1])
    period = found.movement_lsb.reshape(3, -1)
    np.testing.assert_allclose(period[1], period[0])
    # The last point lies half a grid step before the edge.
    ahead = 1.5 * period[0, -1] - 0.5 * period[0, -2]
    assert ahead == pytest.approx(found.decision_lsb, rel=1e-3)


@pytest.mark.parametrize("layout", ["straight", "ringing", "differential"])
def test_a_code_step_adds_up_edge_by_edge(layout: str) -> None:
    plan = ladder_plan(4, 9000.0, **LAYOUTS[layout])
    cell = plan.datasheet
    assert cell.kickback_charge is not None
    assert cell.coupling_capacitance is not None
    found = code_step(plan, cell, 9000.0, periods=3)
    assert found is not None
    reference = reference_of(plan)
    system, pushed, nodes = dense_system(reference.network)
    each = pushed @ (reference.taps.T @ np.ones(15)) * reference.split
    period = 1 / plan.converter.sample_rate
    read = reference.taps.toarray() @ nodes / plan.lsb
    step = each * cell.coupling_capacitance * plan.converter.full_scale
    turn = 2 * cell.kickback_charge * each
    for index in (0, 20, 24, 40, 71):
        time = found.time[index]
        state = expm(-system * time) @ step
        for edge in range(1, int(time / period) + 1):
            state = state + expm(-system * (time - edge * period)) @ turn
        # Steps err by 1e-7 of a charge's start each; those of three charges add.
        start = np.abs(read @ turn).max()
        np.testing.assert_allclose(
            found.movement_lsb[index], read @ state, atol=5e-6 * start
        )


def test_what_the_cell_does_not_give_is_not_drawn() -> None:
    plan = ladder_plan(4, 100.0)
    bare = plan.datasheet.model_copy(
        update={"kickback_charge": None, "coupling_capacitance": None}
    )
    assert worst_disturbance(plan, bare, 100.0) is None
    assert code_step(plan, bare, 100.0) is None
