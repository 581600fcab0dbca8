"""Kickback of code sequences, against a march of the whole network with the matrix exponential."""

import numpy as np
import pytest
from scipy.linalg import expm

from flashplan.ladder import disturbance, kickback_memory, solve_ladder
from flashplan.plan import changed_plan
from tests.ladder.ladders import LAYOUTS, dense_system, ladder_plan, reference_of


@pytest.mark.parametrize("layout", LAYOUTS)
def test_a_sequence_leaves_what_a_march_over_all_its_edges_leaves(layout: str) -> None:
    plan = ladder_plan(4, 80_000.0, **LAYOUTS[layout])
    cell = plan.datasheet
    assert cell.kickback_charge is not None
    reference = reference_of(plan)
    codes = np.random.default_rng(5).integers(0, 16, 60)
    memory = kickback_memory(plan, cell)
    assert memory is not None
    found, _ = disturbance(memory, codes, np.ones(60, dtype=int), 15)
    system, pushed, nodes = dense_system(reference.network)
    step = expm(-system / plan.converter.sample_rate)
    state = np.zeros(system.shape[0])
    read = reference.taps.toarray() @ nodes / plan.lsb
    expected = []
    for code in codes:
        expected.append(read @ state)
        sign = np.where(np.arange(15) < code, 1.0, -1.0) * cell.kickback_charge
        state = step @ (state + pushed @ (reference.taps.T @ sign * reference.split))
    scale = np.abs(expected).max()
    assert scale > 1e-3  # there is something to remember
    np.testing.assert_allclose(found, expected, atol=1e-6 * scale)


def test_blocks_of_any_size_give_the_same_numbers() -> None:
    plan = ladder_plan(6, 5000.0, **LAYOUTS["ringing"])
    memory = kickback_memory(plan, plan.datasheet)
    assert memory is not None
    codes = np.random.default_rng(1).integers(0, 64, 500)
    first = codes - 4
    whole, end = disturbance(memory, codes, first, 8)
    parts, state = [], None
    for block in (slice(0, 7), slice(7, 300), slice(300, 500)):
        part, state = disturbance(memory, codes[block], first[block], 8, state)
        parts.append(part)
    np.testing.assert_allclose(np.concatenate(parts), whole, rtol=1e-12, atol=1e-15)
    assert state is not None
    np.testing.assert_allclose(state, end)
    beyond = (first[:, None] + np.arange(8) < 1) | (first[:, None] + np.arange(8) > 63)
    assert beyond.any()
    assert np.all(whole[beyond] == 0)


def test_a_code_that_stays_ends_at_kickback_at_rest() -> None:
    # At rest comparator k itself pushes nothing: the mean of the two codes that it is torn between.
    plan = ladder_plan(5, 8000.0)
    memory = kickback_memory(plan, plan.datasheet)
    assert memory is not None
    rest = solve_ladder(plan).kickback_lsb
    assert rest is not None
    for k in (3, 16, 25):
        last = [
            disturbance(memory, np.full(400, code), np.full(400, k), 1)[0][-1, 0]
            for code in (k - 1, k)
        ]
        assert np.mean(last) == pytest.approx(rest[k - 1], rel=1e-6)


def test_a_quick_ladder_forgets_all_and_an_unknown_charge_is_not_zero() -> None:
    plan = ladder_plan(4, 1.0)
    memory = kickback_memory(plan, plan.datasheet)
    assert memory is not None
    assert memory.decay.size == 0
    moved, _ = disturbance(memory, np.array([3, 9]), np.array([1, 1]), 15)
    np.testing.assert_array_equal(moved, 0)
    bare = changed_plan(plan, {"comparator.datasheet": {"delay": "40 ps"}})
    assert kickback_memory(bare, bare.datasheet) is None
