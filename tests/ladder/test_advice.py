"""Advice: each change is the plan with that change made."""

import pytest

from flashplan.ladder import solve_ladder
from flashplan.ladder.advice import advise
from flashplan.plan import changed_plan
from tests.ladder.ladders import ladder_plan


def test_each_change_is_the_plan_changed_by_hand() -> None:
    plan = ladder_plan(6, 8000.0)
    by_name = {change.name: change for change in advise(plan, plan.datasheet, 8000.0)}
    hand = {
        "as planned": {},
        "middle tap forced": {"ladder.forced_taps": [32]},
        "twice the tap capacitance": {"ladder.tap_capacitance": "30 fF"},
        "half the coupling": {"comparator.datasheet.coupling_capacitance": "0.15 fF"},
        "half the clock and input frequency": {
            "converter.sample_rate": "500 MHz",
            "converter.input_frequency": "245 MHz",
        },
    }
    assert list(by_name) == list(hand)
    for name, changes in hand.items():
        changed = changed_plan(plan, changes)
        result = solve_ladder(changed)
        assert result.kickback_lsb is not None
        assert by_name[name].kickback_lsb == pytest.approx(
            abs(result.kickback_lsb).max()
        )
        assert result.feedthrough_lsb is not None
        assert by_name[name].feedthrough_lsb == pytest.approx(
            abs(result.feedthrough_lsb).max()
        )


def test_forcing_the_middle_tap_helps_and_is_not_advised_twice() -> None:
    plan = ladder_plan(6, 2000.0)
    planned, forced, *_ = advise(plan, plan.datasheet, 2000.0)
    assert forced.moving_lsb2 < planned.moving_lsb2
    assert forced.systematic_lsb < planned.systematic_lsb
    done = ladder_plan(6, 2000.0, forced_taps=[32])
    names = [change.name for change in advise(done, done.datasheet, 2000.0)]
    assert "middle tap forced" not in names
