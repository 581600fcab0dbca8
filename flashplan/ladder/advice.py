"""What would help a ladder, in numbers: the same ladder with one thing changed."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from flashplan.ladder.effects import tap_error_power
from flashplan.ladder.result import LadderResult, linearity
from flashplan.ladder.solve import solve_ladder
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan


@dataclass(frozen=True)
class Change:
    """One changed ladder: largest error by effect in LSB, None where the cell does not give it.

    systematic_lsb: largest of |DNL| and |INL| of all fixed errors. moving_lsb2: error power of kickback, feedthrough
    and noise under a full-scale sine. power in W, of the references.
    """

    name: str
    kickback_lsb: float | None
    feedthrough_lsb: float | None
    noise_lsb: float
    systematic_lsb: float
    moving_lsb2: float
    power: float


def advise(plan: Plan, cell: Datasheet, total_resistance: float) -> list[Change]:
    """The plan's ladder as it is, then with each change by itself, at the same total resistance in ohm."""
    return [
        _as_change(name, solve_ladder(*change(plan, cell), total_resistance), plan)
        for name, change in _CHANGES.items()
        if name != _FORCED or _middle(plan) not in plan.ladder.forced_taps
    ]


def _middle(plan: Plan) -> int:
    return 2 ** (plan.converter.bits - 1)


def _as_is(plan: Plan, cell: Datasheet) -> tuple[Plan, Datasheet]:
    return plan, cell


def _middle_forced(plan: Plan, cell: Datasheet) -> tuple[Plan, Datasheet]:
    taps = (*plan.ladder.forced_taps, _middle(plan))
    return _with_ladder(plan, forced_taps=taps), cell


def _more_capacitance(plan: Plan, cell: Datasheet) -> tuple[Plan, Datasheet]:
    return _with_ladder(plan, tap_capacitance=2 * plan.ladder.tap_capacitance), cell


def _less_coupling(plan: Plan, cell: Datasheet) -> tuple[Plan, Datasheet]:
    coupling = cell.coupling_capacitance
    return plan, cell.model_copy(
        update={"coupling_capacitance": None if coupling is None else coupling / 2}
    )


def _slower_clock(plan: Plan, cell: Datasheet) -> tuple[Plan, Datasheet]:
    converter = plan.converter
    slower = {
        "sample_rate": converter.sample_rate / 2,
        "input_frequency": converter.input_frequency / 2,
    }
    return plan.model_copy(
        update={"converter": converter.model_copy(update=slower)}
    ), cell


def _with_ladder(plan: Plan, **changes: object) -> Plan:
    return plan.model_copy(update={"ladder": plan.ladder.model_copy(update=changes)})


_FORCED = "middle tap forced"
_CHANGES: dict[str, Callable[[Plan, Datasheet], tuple[Plan, Datasheet]]] = {
    "as planned": _as_is,
    _FORCED: _middle_forced,
    "twice the tap capacitance": _more_capacitance,
    "half the coupling": _less_coupling,
    "half the clock and input frequency": _slower_clock,
}


def _as_change(name: str, result: LadderResult, plan: Plan) -> Change:
    kickback, through = result.kickback_lsb, result.feedthrough_lsb
    return Change(
        name,
        None if kickback is None else float(np.abs(kickback).max()),
        None if through is None else float(np.abs(through).max()),
        float(result.noise_sigma_lsb.max()),
        max(linearity(result)["systematic"]),
        tap_error_power(kickback, through, result.noise_sigma_lsb, plan.converter.bits),
        result.power,
    )
