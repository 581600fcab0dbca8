"""The plan's ladder solved: every effect at every tap."""

import numpy as np

from flashplan.errors import InputError
from flashplan.ladder.effects import feedthrough_phasor, mismatch_sigma, noise_sigma
from flashplan.ladder.kickback import residue_at_rest
from flashplan.ladder.network import dc_voltages
from flashplan.ladder.result import LadderResult
from flashplan.ladder.straight import at_taps, ladder_network
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
    resistance, count, lsb = float(given), plan.comparators, plan.lsb
    network = ladder_network(plan, cell, resistance)
    still = plan.model_copy(
        update={"ladder": plan.ladder.model_copy(update={"bias_current": 0.0})}
    )
    tap = np.arange(1, count + 1)
    held = tap * lsb
    without_bias = at_taps(
        network, dc_voltages(ladder_network(still, cell, resistance)), count, held
    )
    at_rest = at_taps(network, dc_voltages(network), count, held)
    kickback = None
    if cell.kickback_charge is not None:
        period = 1.0 / plan.converter.sample_rate
        kickback = residue_at_rest(network, count, period) * cell.kickback_charge / lsb
    through = None
    if cell.coupling_capacitance is not None:
        amplitude = plan.converter.full_scale / 2
        through = (
            feedthrough_phasor(
                network, count, plan.converter.input_frequency, amplitude
            )
            / lsb
        )
    return LadderResult(
        total_resistance=resistance,
        taps=at_rest if kickback is None else at_rest + kickback * lsb,
        lead_lsb=without_bias / lsb - tap,
        bias_lsb=(at_rest - without_bias) / lsb,
        kickback_lsb=kickback,
        feedthrough_lsb=through,
        mismatch_sigma_lsb=mismatch_sigma(
            plan.converter.bits, plan.ladder.resistor_sigma, plan.ladder.forced_taps
        ),
        noise_sigma_lsb=noise_sigma(network, count) / lsb,
        power=plan.converter.full_scale**2
        / (resistance + 2 * plan.ladder.end_resistance),
    )
