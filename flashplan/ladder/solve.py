"""The plan's ladder solved: every effect at every tap."""

import numpy as np

from flashplan.errors import InputError
from flashplan.ladder.effects import (
    feedthrough_phasor,
    heat,
    noise_sigma,
    rest_errors,
)
from flashplan.ladder.kickback import lasting_modes, recovery_time, residue_at_rest
from flashplan.ladder.mismatch import mismatch_sigma
from flashplan.ladder.reference import build_reference
from flashplan.ladder.result import LadderResult
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan


def solve_ladder(
    plan: Plan, cell: Datasheet | None = None, total_resistance: float | None = None
) -> LadderResult:
    """Solve the reference ladder of a plan.

    cell: the plan's own where none is given; what it does not give is None in the result. total_resistance: instead of
    the plan's, in ohm. Raises InputError for "auto" without it, which only a budget can work out.
    """
    cell = plan.datasheet if cell is None else cell
    given = (
        plan.ladder.total_resistance if total_resistance is None else total_resistance
    )
    if given == "auto":
        raise InputError(
            '"auto" is worked out by the budget',
            f"{plan.source}: ladder.total_resistance",
        )
    resistance, lsb = float(given), plan.lsb
    period, span = 1.0 / plan.converter.sample_rate, plan.converter.full_scale
    reference = build_reference(plan, cell, resistance)
    rest = rest_errors(plan, resistance)
    kickback = recovery = through = None
    if cell.kickback_charge is not None:
        charge = cell.kickback_charge
        modes = lasting_modes(reference, period)
        kickback = residue_at_rest(reference, modes, period) * charge / lsb
        recovery = recovery_time(reference, modes, period, charge, span, lsb)
    if cell.coupling_capacitance is not None:
        frequency = plan.converter.input_frequency
        through = feedthrough_phasor(reference, frequency, span / 2)[0] / lsb
    fixed = np.sum(list(rest.values()), axis=0)
    if kickback is not None:
        fixed = fixed + kickback
    return LadderResult(
        total_resistance=resistance,
        taps=(np.arange(1, plan.comparators + 1) + fixed) * lsb,
        lead_lsb=rest["lead"],
        bias_lsb=rest["bias"],
        gradient_lsb=rest["gradient"],
        turns_lsb=rest["turns"],
        kickback_lsb=kickback,
        feedthrough_lsb=through,
        mismatch_sigma_lsb=mismatch_sigma(plan, resistance),
        noise_sigma_lsb=noise_sigma(reference) / lsb,
        recovery_time=recovery,
        power=heat(reference.network),
        fit=plan.goals.linearity_fit,
    )
