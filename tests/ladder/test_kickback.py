"""Kickback at rest and recovery, against marches of the whole network over its clock edges."""

import numpy as np
import pytest
from scipy.linalg import expm

from flashplan.ladder import kickback_per_charge, solve_ladder
from flashplan.plan import changed_plan
from tests.ladder.ladders import LAYOUTS, dense_system, ladder_plan, reference_of


@pytest.mark.parametrize("layout", LAYOUTS)
def test_kickback_at_rest_is_where_all_clock_edges_lead(layout: str) -> None:
    plan = ladder_plan(4, 20_000.0, **LAYOUTS[layout])
    reference = reference_of(plan)
    system, pushed, nodes = dense_system(reference.network)
    step = expm(-system / plan.converter.sample_rate)
    settled = np.linalg.solve(np.eye(step.shape[0]) - step, step)
    found = kickback_per_charge(plan, plan.datasheet)
    for k in range(15):
        sign = np.sign(k - np.arange(15.0)) * reference.split
        states = settled @ (pushed @ (reference.taps.T @ sign))
        expected = reference.taps.toarray()[k] @ nodes @ states
        scale = np.abs(found).max()
        assert found[k] == pytest.approx(expected, abs=1e-7 * scale)


@pytest.mark.parametrize("layout", ["straight", "ringing", "coarse"])
@pytest.mark.parametrize("resistance", [50.0, 40_000.0])
def test_recovery_is_the_first_decision_from_which_all_are_sound(
    layout: str, resistance: float
) -> None:
    plan = changed_plan(
        ladder_plan(4, resistance, **LAYOUTS[layout]),
        {"comparator.datasheet.kickback_charge": "8 fC"},
    )
    cell = plan.datasheet
    assert cell.kickback_charge is not None
    assert cell.coupling_capacitance is not None
    period = 1.0 / plan.converter.sample_rate
    reference = reference_of(plan)
    system, pushed, nodes = dense_system(reference.network)
    step = expm(-system * period)
    read = reference.taps.toarray() @ nodes / plan.lsb
    each = reference.taps.T @ np.ones(15)
    charge = pushed @ each * cell.kickback_charge
    rest = np.linalg.solve(np.eye(step.shape[0]) - step, step @ charge)
    # All comparators have pushed down for ever; the input steps right after an edge, and the next edge pushes up.
    state = -(rest + charge) + pushed @ each * cell.coupling_capacitance * 0.8
    off = []
    for _ in range(400):
        state = step @ state
        off.append(np.abs(read @ (state - rest)).max() > 0.1)
        state = state + charge
    last = np.flatnonzero(off).max(initial=-1)
    recovery = solve_ladder(plan).recovery_time
    assert recovery == pytest.approx((last + 2) * period)
    assert last < 390


def test_without_a_charge_nothing_is_said_of_recovery() -> None:
    plan = ladder_plan(4, 100.0)
    bare = plan.datasheet.model_copy(update={"kickback_charge": None})
    assert solve_ladder(plan, bare).recovery_time is None
