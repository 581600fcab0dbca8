"""Figures of the ladder: what is drawn is what was worked out."""

import numpy as np
import pytest
from matplotlib.figure import Figure

from flashplan.ladder import solve_ladder, trade_off
from flashplan.ladder.transients import code_step, worst_disturbance
from flashplan.report import ladder_figures
from flashplan.report.drawing import as_svg
from tests.plans import starter_plan


def drawn(figure: Figure) -> list[np.ndarray]:
    return [line.get_ydata() for line in figure.axes[0].lines]


def test_each_effect_that_is_there_is_a_line_and_the_others_are_named() -> None:
    plan = starter_plan(ladder={"rows": 2, "turn_resistance": 0.1})
    result = solve_ladder(
        plan, plan.datasheet.model_copy(update={"kickback_charge": None})
    )
    figure = ladder_figures.tap_error_figure(result)
    lines = drawn(figure)
    assert len(lines) == 5  # leads, turns, feedthrough, mismatch, noise
    np.testing.assert_array_equal(lines[1], result.turns_lsb)
    label = figure.axes[0].get_xlabel()
    assert "kickback at rest not known" in label
    assert "bias current nil" in label
    assert as_svg(figure).startswith("<?xml")


def test_the_disturbance_is_drawn_with_its_decisions() -> None:
    plan = starter_plan()
    found = worst_disturbance(plan, plan.datasheet, 5000.0)
    assert found is not None
    curve, decisions = drawn(ladder_figures.disturbance_figure(found))
    np.testing.assert_array_equal(curve, found.movement_lsb)
    assert decisions.tolist() == pytest.approx([found.decision_lsb] * 3)


def test_the_step_map_has_a_row_for_each_tap() -> None:
    plan = starter_plan()
    found = code_step(plan, plan.datasheet, 5000.0)
    assert found is not None
    figure = ladder_figures.step_map_figure(found)
    image = figure.axes[0].images[0]
    np.testing.assert_array_equal(image.get_array(), found.movement_lsb.T)


def test_the_trade_off_is_drawn_against_its_rooms() -> None:
    plan = starter_plan()
    trade = trade_off(plan, plan.datasheet, np.geomspace(10, 1e4, 8))
    figure = ladder_figures.tradeoff_figure(trade, 0.1, 1e-3, chosen=200.0)
    fixed, kickback, through, noise, room, chosen = drawn(figure)
    np.testing.assert_allclose(fixed, trade.systematic_lsb / 0.1)
    np.testing.assert_allclose(kickback, trade.kickback_lsb2 / 1e-3)
    np.testing.assert_allclose(through, trade.feedthrough_lsb2 / 1e-3)
    np.testing.assert_allclose(noise, trade.noise_lsb2 / 1e-3)
    assert set(room) == {1.0}
    assert len(chosen) == 2


def test_the_upper_axis_puts_each_power_over_its_resistance() -> None:
    plan = starter_plan(ladder={"end_resistance": 0})
    trade = trade_off(plan, plan.datasheet, np.geomspace(10, 1e4, 300))
    axes = ladder_figures.tradeoff_figure(trade, 0.1, 1e-3).axes[0]
    above = axes.child_axes[0]
    labels = [label.get_text() for label in above.get_xticklabels()]
    places = dict(zip(labels, above.get_xticks(), strict=True))
    # P = V^2 / R of 0.8 V.
    assert places["1 mW"] == pytest.approx(640, rel=1e-3)
    assert places["10 mW"] == pytest.approx(64, rel=1e-3)
