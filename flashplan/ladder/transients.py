"""The ladder in time: the worst tap over some clock periods, and all taps after a step of the code."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.ladder.kickback import residue_at_rest, threshold_shapes
from flashplan.ladder.modes import network_modes
from flashplan.ladder.reference import build_reference
from flashplan.ladder.response import SPENT, charge_response
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Disturbance:
    """Movement of one threshold in LSB, (t,), at times in s, (t,), from a clock edge on; the input rests at it.

    tap: from 1. decision_lsb: where the decisions find it, just before each edge.
    """

    tap: int
    period: float
    time: Floats
    movement_lsb: Floats
    decision_lsb: float


@dataclass(frozen=True)
class StepMap:
    """Movement of all thresholds in LSB, (t, M), at times in s, (t,), after the input steps from end to end at time 0.

    The comparators turn over one period later and stay. The movement is against what the old code kept doing.
    """

    period: float
    time: Floats
    movement_lsb: Floats


def worst_disturbance(
    plan: Plan, cell: Datasheet, total_resistance: float, periods: int = 3
) -> Disturbance | None:
    """Threshold that kickback moves most, in periodic steady state; None where the cell gives no charge.

    Each edge pushes as in `kickback_per_charge`, so that one period shows all: with modes of rate r and shape x, all
    edges up to the latest leave exp(-r t) / (1 - exp(-r T)) of each.
    """
    if cell.kickback_charge is None:
        return None
    per_period = 200
    period = 1.0 / plan.converter.sample_rate
    reference = build_reference(plan, cell, total_resistance)
    inside = (np.arange(per_period) + 0.5) / per_period * period
    modes = network_modes(reference.network, fastest=SPENT / inside[0])
    residue = residue_at_rest(reference, modes, period)
    worst = int(np.argmax(np.abs(residue)))
    sign = np.sign(worst - np.arange(plan.comparators))
    charge = cell.kickback_charge * reference.split * sign
    shape = threshold_shapes(reference, modes)
    pushed = (charge @ shape) / -np.expm1(-modes.rate * period)
    moved = (
        np.exp(-np.multiply.outer(inside, modes.rate)) @ (shape[worst] * pushed)
    ).real
    start = np.arange(periods)[:, None] * period
    return Disturbance(
        worst + 1,
        period,
        (start + inside).ravel(),
        np.tile(moved / plan.lsb, periods),
        float(residue[worst] * cell.kickback_charge / plan.lsb),
    )


def code_step(
    plan: Plan, cell: Datasheet, total_resistance: float, periods: int = 6
) -> StepMap | None:
    """All thresholds after a full-scale step of the input; None where the cell gives neither charge nor coupling."""
    if cell.kickback_charge is None and not cell.coupling_capacitance:
        return None
    per_period = 24
    period = 1.0 / plan.converter.sample_rate
    reference = build_reference(plan, cell, total_resistance)
    network = reference.network
    time = (np.arange(periods * per_period) + 0.5) / per_period * period
    drive = np.array([reference.drive.get(name, 0.0) for name in network.held])
    step = network.capacitance_to @ drive * plan.converter.full_scale
    moved = charge_response(network, step, time)
    if cell.kickback_charge is not None:
        turned = 2.0 * cell.kickback_charge * reference.split
        edge = charge_response(
            network, reference.taps.T @ np.full(plan.comparators, turned), time
        )
        # One edge a period, the first after one period: the answers to all earlier edges add.
        by_period = edge.reshape(periods, per_period, -1)
        moved[per_period:] += np.cumsum(by_period, axis=0)[:-1].reshape(
            -1, edge.shape[1]
        )
    return StepMap(period, time, np.asarray(moved @ reference.taps.T) / plan.lsb)
