"""Networks that cannot be: the message names the part."""

import pytest

from flashplan.errors import InputError
from flashplan.ladder import solve_ladder
from flashplan.ladder.network import GROUND, Part, build_network, dc_voltages
from tests.plans import starter_plan


def test_a_divider_divides() -> None:
    parts = [
        Part("voltage", "supply", GROUND, 3.0, "supply"),
        Part("resistor", "supply", "middle", 2.0, "upper"),
        Part("resistor", "middle", GROUND, 1.0, "lower"),
        Part("current", "middle", GROUND, 0.3, "load"),
    ]
    assert dc_voltages(build_network(parts)) == pytest.approx([1.0 - 0.3 * 2 / 3])


@pytest.mark.parametrize(
    ("part", "says"),
    [
        (
            Part("resistor", "a", GROUND, -1.0, "upper arm"),
            "upper arm must be positive",
        ),
        (
            Part("capacitor", "a", GROUND, 0.0, "load capacitance"),
            "load capacitance must be positive",
        ),
        (
            Part("voltage", "a", GROUND, 1.0, "second source"),
            "second source closes a loop of voltage sources",
        ),
        (
            Part("voltage", "b", "c", 1.0, "bridge"),
            "bridge between b and c is not tied to ground by sources",
        ),
        (
            Part("inductor", "a", GROUND, 1e-9, "short coil"),
            "short coil closes a loop of inductors and voltage sources",
        ),
        (
            Part("resistor", "a", GROUND, float("nan"), "odd arm"),
            "odd arm must be finite",
        ),
        (
            Part("capacitor", "far", GROUND, 1e-15, "far load"),
            "node far floats.*far load",
        ),
    ],
)
def test_what_is_wrong_is_named(part: Part, says: str) -> None:
    sound = [
        Part("voltage", "a", GROUND, 1.0, "source"),
        Part("resistor", "a", GROUND, 1.0, "load"),
    ]
    with pytest.raises(InputError, match=says):
        build_network([*sound, part])


def test_what_the_cell_does_not_give_is_not_assumed_zero() -> None:
    plan = starter_plan()
    bare = plan.datasheet.model_copy(
        update={"kickback_charge": None, "coupling_capacitance": None}
    )
    result = solve_ladder(plan, bare)
    assert result.kickback_lsb is None
    assert result.feedthrough_lsb is None
    assert result.to_dict()["errors_lsb"]["kickback"] is None
