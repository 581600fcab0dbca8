"""Layouts of the ladder: what each does to the taps."""

import numpy as np
import pytest
from hypothesis import Phase, given, settings
from hypothesis import strategies as st

from flashplan.errors import InputError
from flashplan.ladder import LadderResult, solve_ladder
from flashplan.ladder.reference import rescaled
from tests.ladder.ladders import LAYOUTS, RINGING, ladder_plan, reference_of


@pytest.mark.parametrize("layout", [name for name in LAYOUTS if name != "folded"])
def test_no_layout_of_equal_units_and_no_leads_moves_a_tap(layout: str) -> None:
    changes = {**LAYOUTS[layout], "reference_resistance": 0, "turn_resistance": 0}
    result = solve_ladder(ladder_plan(4, 100.0, **changes))
    for errors in (result.lead_lsb, result.turns_lsb, result.gradient_lsb):
        np.testing.assert_allclose(errors, 0, atol=1e-12)


def test_a_turn_is_a_step_between_its_neighbours() -> None:
    # 16 units of 1 ohm and one turn of 0.1 ohm in the middle: each step is 16 / 16.1 of an LSB, the middle one 1.1 of it.
    result = solve_ladder(ladder_plan(4, 16.0, rows=2, turn_resistance=0.1))
    steps = np.diff(np.arange(1, 16) + result.turns_lsb)
    expected = np.full(14, 16 / 16.1)
    expected[7] *= 1.1
    np.testing.assert_allclose(steps, expected, rtol=1e-12)


def test_folding_cancels_a_linear_gradient_at_each_second_turn() -> None:
    straight = solve_ladder(ladder_plan(6, 64.0, gradient_linear=0.04))
    folded = solve_ladder(ladder_plan(6, 64.0, gradient_linear=0.04, rows=4))
    assert np.abs(folded.gradient_lsb[[31]]).max() < 1e-10
    assert np.abs(folded.gradient_lsb).max() < np.abs(straight.gradient_lsb).max() / 3.9


def test_a_coarse_string_holds_its_taps_against_bias_currents() -> None:
    bias = {"bias_current": 1e-6, "resistor_sigma": 0.01}
    plain = solve_ladder(ladder_plan(6, 640.0, **bias))
    coarse = solve_ladder(
        ladder_plan(6, 640.0, coarse_segments=8, coarse_ratio=0.01, **bias)
    )
    assert np.abs(coarse.bias_lsb).max() < np.abs(plain.bias_lsb).max() / 20
    # A hundredth of the resistance beside it; the bias currents' own heat is small.
    assert coarse.power == pytest.approx(101 * 0.8**2 / 640, rel=2e-3)
    # The fine units' own part between two coarse taps is a pinned walk over 8 units.
    assert coarse.mismatch_sigma_lsb[3] == pytest.approx(0.01 * np.sqrt(2), rel=0.01)


def test_a_pair_of_strings_cancels_bias_and_halves_power() -> None:
    changes = {
        "bias_current": 1e-6,
        "end_resistance": 1,
        "resistor_sigma": 0.01,
        "gradient_linear": 0.01,
    }
    single = solve_ladder(ladder_plan(5, 400.0, **changes))
    pair = solve_ladder(ladder_plan(5, 400.0, differential=True, **changes))
    np.testing.assert_allclose(pair.bias_lsb, 0, atol=1e-9)
    for name in ("lead_lsb", "gradient_lsb", "kickback_lsb", "feedthrough_lsb"):
        expected = getattr(single, name)
        np.testing.assert_allclose(getattr(pair, name), expected, rtol=1e-6, atol=1e-9)
    assert pair.power == pytest.approx(single.power / 2, rel=0.01)
    ratio = pair.mismatch_sigma_lsb / single.mismatch_sigma_lsb
    np.testing.assert_allclose(ratio, np.sqrt(0.5))
    ratio = pair.noise_sigma_lsb / single.noise_sigma_lsb
    np.testing.assert_allclose(ratio, np.sqrt(2))


@given(
    end=st.sampled_from([0.0, 0.3, 5.0]),
    bias=st.floats(-1e-6, 1e-6),
    half_rows=st.integers(0, 3),
    linear=st.floats(-0.1, 0.1),
    quadratic=st.floats(-0.1, 0.1),
    segments=st.sampled_from([0, 2, 8]),
    ringing=st.booleans(),
)
@settings(max_examples=25, deadline=None, phases=[Phase.explicit, Phase.generate])
def test_a_ladder_upside_down_is_the_same_ladder(
    end: float,
    bias: float,
    half_rows: int,
    linear: float,
    quadratic: float,
    segments: int,
    ringing: bool,
) -> None:
    # An even number of rows, or one row whose linear gradient turns over with it.
    layout = {
        "end_resistance": end,
        "bias_current": bias,
        "gradient_quadratic": quadratic,
        "resistor_sigma": 0.01,
        "rows": 2 * half_rows or 1,
        **(RINGING if ringing else {}),
    }
    if segments:
        layout |= {"coarse_segments": segments, "coarse_ratio": 0.5}
    turned = linear if half_rows else -linear
    up = solve_ladder(ladder_plan(4, 3000.0, gradient_linear=linear, **layout))
    down = solve_ladder(ladder_plan(4, 3000.0, gradient_linear=turned, **layout))
    _same(up, down, sign=-1, names=("lead", "gradient", "kickback"))
    _same(up, down, sign=1, names=("bias", "feedthrough", "mismatch_sigma"))


def _same(
    up: LadderResult, down: LadderResult, sign: int, names: tuple[str, ...]
) -> None:
    for name in names:
        here, there = (getattr(result, f"{name}_lsb") for result in (up, down))
        np.testing.assert_allclose(here, sign * there[::-1], rtol=1e-6, atol=1e-8)


@pytest.mark.parametrize("layout", LAYOUTS)
def test_a_rescaled_reference_is_the_one_built_anew(layout: str) -> None:
    plan = ladder_plan(4, 100.0, **LAYOUTS[layout])
    scaled = rescaled(reference_of(plan), 250.0).network
    anew = reference_of(ladder_plan(4, 250.0, **LAYOUTS[layout])).network
    np.testing.assert_allclose(
        scaled.conductance.toarray(), anew.conductance.toarray(), rtol=1e-12
    )
    np.testing.assert_allclose(
        scaled.conductance_to.toarray(), anew.conductance_to.toarray(), rtol=1e-12
    )


@pytest.mark.parametrize(
    ("changes", "says"),
    [
        ({"forced_taps": [16]}, r"ladder\.forced_taps: tap 16 is beyond"),
        ({"forced_taps": [3, 3]}, "names a tap twice"),
        ({"rows": 17}, r"ladder\.rows: 17 rows"),
        (
            {"coarse_segments": 3, "coarse_ratio": 1},
            r"ladder\.coarse_segments: 16 units cannot be split evenly into 3",
        ),
        ({"coarse_segments": 4}, "come together"),
        ({"lead_inductance": "1 nF"}, r"ladder\.lead_inductance"),
    ],
)
def test_what_cannot_be_built_is_refused_by_its_key(
    changes: dict[str, object], says: str
) -> None:
    with pytest.raises(InputError, match=says):
        solve_ladder(ladder_plan(4, 100.0, **changes))
