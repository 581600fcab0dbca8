"""Kickback at rest and after a step: what earlier decisions have left at a tap when the next one falls."""

import numpy as np
from numpy.typing import NDArray

from flashplan.ladder.modes import Modes, network_modes
from flashplan.ladder.reference import Reference, build_reference
from flashplan.ladder.response import SPENT
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]

RECOVERED_LSB = 0.1
_BLOCK = 1024  # decisions looked at together


def kickback_per_charge(
    plan: Plan, cell: Datasheet, total_resistance: float | None = None
) -> Floats:
    """Shift of each threshold for a kickback charge of 1 C, in V: (M,).

    For threshold k the input rests at it: at each clock edge every comparator below pushes +1 C into its tap, every one
    above -1 C, itself nothing; the shift is what is left at tap k one period after the latest edge, all earlier edges
    included. With modes of rate r and shape x, what one edge leaves after n periods is d**n, d = exp(-r T), so that all
    edges together leave d / (1 - d).
    """
    resistance = (
        float(plan.ladder.total_resistance)
        if total_resistance is None
        else total_resistance
    )
    reference = build_reference(plan, cell, resistance)
    period = 1.0 / plan.converter.sample_rate
    return residue_at_rest(reference, lasting_modes(reference, period), period)


def lasting_modes(reference: Reference, period: float) -> Modes:
    """The modes of which a period, in s, leaves anything."""
    return network_modes(reference.network, fastest=SPENT / period)


def threshold_shapes(reference: Reference, modes: Modes) -> NDArray:
    """Movement of each threshold in each mode, (M, m), complex where an inductor rings."""
    return np.asarray(reference.taps @ modes.shape)


def summed_decay(modes: Modes, period: float) -> NDArray:
    """What all edges, one a period in s, leave of each mode just before the next: d / (1 - d), (m,)."""
    left = modes.rate * period
    return np.asarray(np.exp(-left) / -np.expm1(-left))


def residue_at_rest(reference: Reference, modes: Modes, period: float) -> Floats:
    """As `kickback_per_charge`, of a network with its lasting modes; period in s."""
    shape = threshold_shapes(reference, modes)
    # Charge below minus charge above tap k, as each mode sees it: a cumulative sum instead of a matrix for each k.
    below = np.cumsum(shape, axis=0)
    pushed = 2.0 * below - shape - below[-1]
    left = reference.split * summed_decay(modes, period)
    return np.asarray(((shape * pushed) @ left).real)


def recovery_time(
    reference: Reference,
    modes: Modes,
    period: float,
    charge: float,
    full_scale: float,
    lsb: float,
) -> float:
    """Time in s after a step of the input from end to end, until decisions are sound again.

    The step couples into the taps, and one period later all comparators turn over, each pushing `charge` (C) the other
    way. A decision is sound when it and all later ones find every tap within RECOVERED_LSB of where it comes to rest.
    """
    shape = threshold_shapes(reference, modes)
    left = np.exp(-modes.rate * period)
    turned = 2.0 * charge * reference.split * shape.sum(axis=0)
    drive = np.array(
        [reference.drive.get(name, 0.0) for name in reference.network.held]
    )
    coupled = modes.shape.T @ (reference.network.capacitance_to @ drive * full_scale)
    # How far the first decision after the step finds each mode from its new rest.
    first = coupled * left - turned * summed_decay(modes, period)
    late = np.abs(first) * np.abs(shape).max(axis=0, initial=0.0)
    total = float(late.sum())
    if total <= RECOVERED_LSB * lsb:
        return period
    slowest = float(modes.rate.real.min()) * period
    bound = int(np.ceil(np.log(total / (RECOVERED_LSB * lsb)) / slowest))
    # The bound adds all modes up; the last decision that is truly off comes before it.
    for end in range(bound, 0, -_BLOCK):
        decisions = np.arange(max(end - _BLOCK, 0), end)
        decay = np.exp(-np.multiply.outer(decisions, modes.rate * period))
        off = np.abs(((decay * first) @ shape.T).real).max(axis=1) > RECOVERED_LSB * lsb
        if off.any():
            return float(decisions[off].max() + 2) * period
    return period
