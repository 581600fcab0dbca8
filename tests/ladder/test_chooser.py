"""The largest resistance: where the room ends, what ends it, and the trade-off around it."""

import numpy as np
import pytest

from flashplan.ladder import (
    largest_resistance,
    linearity,
    solve_ladder,
    systematic_errors,
    tap_error_power,
    trade_off,
)
from flashplan.metrics.linearity import dnl_inl
from flashplan.plan import Plan
from tests.ladder.ladders import LAYOUTS, ladder_plan


def used_power(plan: Plan, resistance: float) -> float:
    result = solve_ladder(plan, None, resistance)
    return tap_error_power(
        result.kickback_lsb,
        result.feedthrough_lsb,
        result.noise_sigma_lsb,
        plan.converter.bits,
    )


@pytest.mark.parametrize(
    ("layout", "effect"),
    [
        ("straight", "feedthrough"),
        ("coarse", "feedthrough"),
        ("ringing", "feedthrough"),
        (
            "differential",
            "noise",
        ),  # of two strings, which takes more than half the room
    ],
)
def test_the_limit_fills_its_room_and_no_more(layout: str, effect: str) -> None:
    plan = ladder_plan(6, 100.0, **LAYOUTS[layout])
    found = largest_resistance(plan, plan.datasheet, 10.0, 5e-3)
    assert (found.binding, found.effect) == ("enob", effect)
    assert used_power(plan, found.limit) == pytest.approx(5e-3, rel=1e-6)
    assert used_power(plan, found.limit * 1.01) > 5e-3


def test_kickback_can_bind_through_linearity() -> None:
    plan = ladder_plan(6, 100.0)
    quiet = plan.datasheet.model_copy(update={"coupling_capacitance": 0.0})
    found = largest_resistance(plan, quiet, 0.02, 1.0)
    assert (found.binding, found.effect) == ("linearity", "kickback")
    result = solve_ladder(plan, quiet, found.limit)
    dnl, inl = dnl_inl(systematic_errors(result), plan.goals.linearity_fit)
    assert max(np.abs(dnl).max(), np.abs(inl).max()) == pytest.approx(0.02, rel=1e-6)
    assert max(linearity(result)["systematic"]) == pytest.approx(0.02, rel=1e-6)


def test_leads_can_leave_no_window_and_the_note_says_so() -> None:
    plan = ladder_plan(6, 100.0, turn_resistance=5, rows=2)
    found = largest_resistance(plan, plan.datasheet, 0.01, 5e-3)
    assert found.limit == 0
    assert (found.binding, found.effect) == ("linearity", "turns")
    assert "no resistance fits" in found.note


def test_noise_alone_sets_no_upper_end() -> None:
    plan = ladder_plan(4, 100.0)
    bare = plan.datasheet.model_copy(
        update={"coupling_capacitance": None, "kickback_charge": None}
    )
    assert largest_resistance(plan, bare, 0.1, 1.0).limit == 1e6
    found = largest_resistance(plan, bare, 0.1, 1e-9)
    assert (found.limit, found.effect) == (0, "noise")


def test_the_trade_off_is_what_each_ladder_solved_by_itself_says() -> None:
    plan = ladder_plan(5, 100.0, end_resistance=0.5, **LAYOUTS["folded"])
    resistances = [30.0, 300.0, 20_000.0]
    trade = trade_off(plan, plan.datasheet, resistances)
    for index, resistance in enumerate(resistances):
        result = solve_ladder(plan, None, resistance)
        moving = trade.kickback_lsb2 + trade.feedthrough_lsb2 + trade.noise_lsb2
        assert moving[index] == pytest.approx(used_power(plan, resistance))
        assert trade.power[index] == pytest.approx(result.power)
        assert trade.systematic_lsb[index] == pytest.approx(
            max(linearity(result)["systematic"]), abs=1e-9
        )
    assert set(trade.to_dict()) >= {"total_resistance", "power", "kickback_lsb2"}
