"""A datasheet against the budget."""

import pytest

from flashplan.budget.derive import derive_budget
from flashplan.cell.check import check_cell
from flashplan.plan import Datasheet
from flashplan.report.words import verdict_sentence
from tests.plans import starter_plan

CELL_LINES = (
    "offset_sigma",
    "noise_sigma",
    "hysteresis",
    "skew_sigma",
    "regeneration_tau",
    "delay",
    "kickback_charge",
    "input_capacitance",
)


def on_its_limits(factor: float = 1.0) -> Datasheet:
    budget = derive_budget(starter_plan())
    values = {name: budget.lines[name].limit for name in CELL_LINES}
    return Datasheet(
        **{name: value * factor for name, value in values.items() if value is not None}
    )


def test_a_cell_on_every_limit_is_good_enough() -> None:
    verdict = check_cell(on_its_limits(), derive_budget(starter_plan()))
    assert verdict.met
    for name in CELL_LINES:
        assert verdict.lines[name].margin == pytest.approx(0.0, abs=1e-12)


def test_a_cell_a_thousandth_above_its_limits_is_not() -> None:
    verdict = check_cell(on_its_limits(1.001), derive_budget(starter_plan()))
    assert not verdict.met
    assert all(verdict.lines[name].met is False for name in CELL_LINES)
    assert "8 of 11 limits broken" in verdict_sentence(verdict)


def test_what_the_datasheet_does_not_give_is_named_and_not_assumed_zero() -> None:
    cell = on_its_limits().model_copy(update={"skew_sigma": None})
    verdict = check_cell(cell, derive_budget(starter_plan()))
    assert not verdict.met
    assert verdict.lines["skew_sigma"].met is None
    assert verdict.lines["skew_sigma"].margin is None
    assert (
        "Not judged, since the datasheet does not give it: skew_sigma"
        in verdict_sentence(verdict)
    )


def test_the_plans_own_clock_and_ladder_are_judged_too() -> None:
    plan = starter_plan(
        clock={"jitter_sigma": "5 ps"}, ladder={"total_resistance": "5 kohm"}
    )
    verdict = check_cell(on_its_limits(), derive_budget(plan))
    assert verdict.lines["jitter_sigma"].met is False
    assert verdict.lines["ladder_resistance"].met is False
    assert verdict.lines["resistor_sigma"].met is True


def test_a_cell_with_less_gain_must_regenerate_faster() -> None:
    budget = derive_budget(starter_plan())
    slow = check_cell(
        on_its_limits().model_copy(update={"regeneration_gain": 1.0}), budget
    )
    assert slow.lines["regeneration_tau"].met is False
    assert slow.lines["regeneration_tau"].limit < budget.lines["regeneration_tau"].limit  # type: ignore[operator]
