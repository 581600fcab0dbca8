"""Limits that the reference ladder sets: its resistance, and the charge that a decision may push into a tap."""

import math

import numpy as np
from scipy.optimize import brentq

from flashplan.budget.result import BudgetLine, Input
from flashplan.budget.room import RESISTOR_PART, ErrorRoom, error_room
from flashplan.errors import InputError
from flashplan.ladder import (
    kickback_per_charge,
    largest_resistance,
    solve_ladder,
    systematic_errors,
    tap_error_power,
)
from flashplan.metrics.linearity import Fit, dnl_inl
from flashplan.plan.load import changed_plan
from flashplan.plan.model import Plan

_SOURCE = "nodal analysis of the ladder's network, exact modes in time, complex admittances at input_frequency"


def moving_room(plan: Plan, room: ErrorRoom) -> float:
    """Error power that kickback, feedthrough and the ladder's noise may add together, in LSB^2."""
    return (1.0 - RESISTOR_PART) * plan.allocation.ladder * room.excess


def resolved(plan: Plan) -> Plan:
    """The plan with a ladder resistance in ohm: its own, or the largest that the budget allows where it says "auto".

    Raises InputError when "auto" cannot be worked out.
    """
    if plan.ladder.total_resistance != "auto":
        return plan
    line = ladder_line(plan, error_room(plan))
    if not line.limit:
        raise InputError(
            f'"auto" cannot be worked out: {line.note}',
            f"{plan.source}: ladder.total_resistance",
        )
    return changed_plan(plan, {"ladder.total_resistance": line.limit})


def ladder_line(plan: Plan, room: ErrorRoom) -> BudgetLine:
    """Largest total resistance that keeps the taps' systematic and moving errors inside their room."""
    cell, allocation = plan.datasheet, plan.allocation
    inputs = {
        **_ladder_inputs(plan, room),
        "kickback_charge": Input(
            "unknown" if cell.kickback_charge is None else cell.kickback_charge, "C"
        ),
    }
    missing = [
        key
        for key in ("kickback_charge", "coupling_capacitance")
        if getattr(cell, key) is None
    ]
    limit, binding, note = (
        None,
        "",
        f"the cell gives no {' and no '.join(missing)}, which set it",
    )
    if not missing:
        found = largest_resistance(
            plan, cell, allocation.systematic_lsb, moving_room(plan, room)
        )
        limit, binding, note = found.limit, found.binding, found.note
    return BudgetLine(
        "ladder_resistance",
        limit,
        "ohm",
        "largest R with max |DNL|, |INL| of lead, bias and kickback <= systematic_lsb"
        " and sum w (kickback^2 + feedthrough^2) + noise^2 <= share/2 excess",
        _SOURCE,
        inputs,
        (1.0 - RESISTOR_PART) * allocation.ladder,
        binding=binding,
        note=note,
    )


def kickback_line(plan: Plan, room: ErrorRoom) -> BudgetLine:
    """Largest charge that a decision may push into its tap, with the plan's ladder."""
    cell, allocation = plan.datasheet, plan.allocation
    inputs = _ladder_inputs(plan, room)
    limit, binding, candidates, note = None, "", {}, ""
    try:
        ladder_plan = resolved(plan)
    except InputError:
        note = (
            'ladder.total_resistance is "auto" and the cell does not give what sets it'
        )
    else:
        quiet = solve_ladder(
            ladder_plan, cell.model_copy(update={"kickback_charge": None})
        )
        per_charge = kickback_per_charge(ladder_plan, cell) / plan.lsb
        candidates = {
            "linearity": _largest_systematic_charge(
                systematic_errors(quiet),
                per_charge,
                plan.goals.linearity_fit,
                allocation.systematic_lsb,
            ),
            "enob": _largest_power_charge(
                per_charge,
                moving_room(plan, room)
                - tap_error_power(
                    None,
                    quiet.feedthrough_lsb,
                    quiet.noise_sigma_lsb,
                    plan.converter.bits,
                ),
                plan.converter.bits,
            ),
            # Beyond this a single decision would move its own tap by the whole range, which no linear network describes.
            "linear model": plan.converter.full_scale * plan.ladder.tap_capacitance,
        }
        candidates = {
            name: limit for name, limit in candidates.items() if math.isfinite(limit)
        }
        binding = min(candidates, key=lambda name: candidates[name])
        limit = candidates[binding]
        if limit == 0:
            note = (
                "lead, bias, feedthrough and noise alone use up the room of the ladder"
            )
        inputs["total resistance used"] = Input(quiet.total_resistance, "ohm")
    return BudgetLine(
        "kickback_charge",
        limit,
        "C",
        "largest q with max |DNL|, |INL| of lead, bias and q kickback <= systematic_lsb"
        " and sum w ((q kickback)^2 + feedthrough^2) + noise^2 <= share/2 excess",
        _SOURCE,
        inputs,
        (1.0 - RESISTOR_PART) * allocation.ladder,
        candidates,
        binding,
        note,
    )


def _largest_systematic_charge(
    fixed: np.ndarray, per_charge: np.ndarray, fit: Fit, room: float
) -> float:
    """Largest charge whose kickback on top of the fixed errors stays inside the room, in C; 0 if nothing is left."""

    def excess(charge: float) -> float:
        dnl, inl = dnl_inl(fixed + charge * per_charge, fit)
        return float(max(np.abs(dnl).max(initial=0.0), np.abs(inl).max())) - room

    if excess(0.0) > 0:
        return 0.0

    largest = np.abs(per_charge).max()
    if largest == 0:
        return math.inf
    high = room / (4.0 * largest)
    while excess(high) < 0:
        high *= 2.0
    return float(brentq(excess, 0.0, high, rtol=1e-12))


def _largest_power_charge(per_charge: np.ndarray, room: float, bits: int) -> float:
    """Largest charge whose kickback keeps to an error power in LSB^2, in C; 0 if nothing is left."""
    power = tap_error_power(per_charge, None, None, bits)
    if room <= 0:
        return 0.0
    return math.sqrt(room / power) if power > 0 else math.inf


def _ladder_inputs(plan: Plan, room: ErrorRoom) -> dict[str, Input]:
    ladder, converter, cell = plan.ladder, plan.converter, plan.datasheet
    coupling = cell.coupling_capacitance
    return {
        "converter.bits": Input(converter.bits),
        "converter.full_scale": Input(converter.full_scale, "V"),
        "converter.sample_rate": Input(converter.sample_rate, "Hz"),
        "converter.input_frequency": Input(converter.input_frequency, "Hz"),
        "goals.enob": Input(plan.goals.enob),
        "goals.linearity_fit": Input(plan.goals.linearity_fit),
        "allocation.ladder": Input(plan.allocation.ladder),
        "allocation.systematic_lsb": Input(plan.allocation.systematic_lsb, "lsb"),
        "ladder.total_resistance": Input(ladder.total_resistance, "ohm"),
        "ladder.tap_capacitance": Input(ladder.tap_capacitance, "F"),
        "ladder.end_resistance": Input(ladder.end_resistance, "ohm"),
        "ladder.bias_current": Input(ladder.bias_current, "A"),
        **room.inputs(),
        "coupling_capacitance": Input("unknown" if coupling is None else coupling, "F"),
    }
