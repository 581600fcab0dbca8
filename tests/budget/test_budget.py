"""The budget: its lines, where their limits come from, and what moves them."""

import json
import math
from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flashplan.budget.derive import LINES, derive_budget, derive_line
from flashplan.budget.explain import explain_line
from flashplan.budget.regeneration import regeneration_time
from flashplan.budget.room import error_room
from flashplan.errors import InputError
from flashplan.metrics.exact_yield import linearity_yield
from flashplan.plan import Plan, changed_plan
from tests.plans import starter_plan


def test_every_line_of_the_contract_is_there_with_formula_source_and_inputs() -> None:
    budget = derive_budget(starter_plan())
    assert list(budget.lines) == [
        "offset_sigma",
        "noise_sigma",
        "hysteresis",
        "skew_sigma",
        "jitter_sigma",
        "regeneration_tau",
        "delay",
        "kickback_charge",
        "ladder_resistance",
        "resistor_sigma",
        "input_capacitance",
    ]
    for line in budget.lines.values():
        assert line.limit is not None
        assert line.limit > 0
        assert line.formula
        assert line.source
        assert line.inputs
    json.dumps(budget.to_dict(), allow_nan=False)


def test_the_offset_limit_is_the_tighter_of_yield_and_effective_bits() -> None:
    plan = starter_plan()
    loose = derive_line(
        changed_plan(plan, {"goals.dnl_lsb": 3, "goals.inl_lsb": 3}), "offset_sigma"
    )
    assert loose.binding == "enob"
    tight = derive_line(plan, "offset_sigma")
    assert tight.binding == "yield"
    assert tight.limit == min(tight.candidates.values())
    reached = linearity_yield(
        6, tight.limit / plan.lsb, 0.4, 0.4, "endpoint", plan.ladder.resistor_sigma
    )
    assert reached.yield_ == pytest.approx(plan.goals.yield_, rel=1e-6)


def test_the_tau_limit_takes_delay_at_its_limit_and_says_which_gain() -> None:
    plan = starter_plan()
    line = derive_line(plan, "regeneration_tau")
    assert regeneration_time(plan, 0.15e-9) == pytest.approx(0.35e-9)
    assert line.limit == pytest.approx(
        0.35e-9 / math.log(1.0 / (3 * 12.5e-3 * 1e-12)), rel=1e-12
    )
    assert "the plan's cell" in line.note
    unknown = plan.model_copy(
        update={
            "datasheet": plan.datasheet.model_copy(update={"regeneration_gain": None})
        }
    )
    assert "assumed" in derive_line(unknown, "regeneration_tau").note


def test_a_goal_above_the_ideal_quantiser_is_refused_with_the_ceiling() -> None:
    with pytest.raises(
        InputError,
        match=r"goals.enob: 5.98 effective bits leave no room .* reaches 5.9\d\d",
    ):
        derive_budget(changed_plan(starter_plan(), {"goals.enob": 5.98}))


def test_resistors_that_eat_the_whole_yield_are_refused() -> None:
    with pytest.raises(InputError, match=r"ladder.resistor_sigma"):
        derive_budget(changed_plan(starter_plan(), {"ladder.resistor_sigma": 0.2}))


def test_a_line_that_hangs_on_what_the_cell_does_not_give_says_so() -> None:
    plan = starter_plan()
    bare = plan.model_copy(
        update={
            "datasheet": plan.datasheet.model_copy(update={"kickback_charge": None})
        }
    )
    line = derive_line(bare, "ladder_resistance")
    assert line.limit is None
    assert "kickback_charge" in line.note
    auto = changed_plan(plan, {"ladder.total_resistance": "auto"})
    assert derive_line(auto, "kickback_charge").limit is not None
    without_source = plan.model_copy(
        update={
            "converter": plan.converter.model_copy(update={"source_resistance": None})
        }
    )
    assert derive_line(without_source, "input_capacitance").limit is None


@pytest.mark.parametrize("name", list(LINES))
def test_sensitivities_say_which_way_a_limit_moves(name: str) -> None:
    plan = starter_plan()
    explanation = explain_line(plan, name)
    assert explanation.line == derive_line(plan, name)
    json.dumps(explanation.to_dict(), allow_nan=False)
    if name in ("noise_sigma", "hysteresis", "skew_sigma", "jitter_sigma"):
        moves = {s.key: s.elasticity for s in explanation.sensitivities}
        share = next(key for key in moves if key.startswith("allocation."))
        # The scatter over arrays moves a little with the skew's own share.
        assert moves[share] == pytest.approx(
            0.5, abs=0.15 if name == "skew_sigma" else 0.02
        )
        assert moves["goals.enob"] < 0


def test_a_line_that_is_not_there_is_refused_with_those_that_are() -> None:
    with pytest.raises(InputError, match="offset_sigma, noise_sigma"):
        explain_line(starter_plan(), "offset")


@settings(max_examples=25, deadline=None)
@given(enob=st.floats(4.0, 5.8), share=st.floats(0.01, 0.25))
def test_a_harder_goal_or_a_smaller_share_never_loosens_a_limit(
    enob: float, share: float
) -> None:
    plan = starter_plan()
    first = changed_plan(plan, {"goals.enob": enob, "allocation.noise": share})
    harder = changed_plan(plan, {"goals.enob": enob + 0.05, "allocation.noise": share})
    smaller = changed_plan(plan, {"goals.enob": enob, "allocation.noise": share * 0.9})

    def limit(which: Plan) -> float:
        found = derive_line(which, "noise_sigma").limit
        assert found is not None
        return found

    assert limit(harder) < limit(first)
    assert limit(smaller) < limit(first)


def test_shares_spend_the_excess_and_no_more() -> None:
    plan = starter_plan()
    room = error_room(plan)
    budget = derive_budget(plan)
    noise = budget.lines["noise_sigma"].limit
    assert noise is not None
    assert (noise / plan.lsb) ** 2 * room.threshold_weight == pytest.approx(
        0.25 * room.excess
    )
    spent = sum(
        getattr(plan.allocation, name)
        for name in ("offset", "noise", "hysteresis", "skew", "jitter", "ladder")
    )
    assert spent <= 1
    assert replace(budget, lines={}).allowed_error_lsb2 == pytest.approx(
        room.ideal + room.excess
    )
