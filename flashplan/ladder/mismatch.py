"""Random mismatch of a ladder's resistors: how each tap's error spreads, and how the taps' errors go together."""

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.sparse.linalg import splu

from flashplan.ladder.network import Network, dc_voltages, loss_matrix
from flashplan.ladder.reference import (
    Reference,
    build_reference,
    turns,
    unit_resistances,
)
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]


def mismatch_sigma(plan: Plan, total_resistance: float) -> Floats:
    """Sigma of each threshold in LSB, (M,), to first order in the resistors' own relative sigmas.

    What bias currents add, a small error times a small one, is left out.

    Linear in the number of taps for a string; a coarse string or soft forcing takes the whole covariance.
    """
    ladder = plan.ladder
    if ladder.resistor_sigma == 0 and ladder.coarse_sigma == 0:
        return np.zeros(plan.comparators)
    soft = bool(ladder.forced_taps) and ladder.forced_resistance > 0
    if ladder.coarse_segments or soft:
        return np.sqrt(np.diagonal(mismatch_covariance(plan, total_resistance)))
    return string_sigma(plan, total_resistance)


def string_sigma(plan: Plan, total_resistance: float) -> Floats:
    """As `mismatch_sigma`, of plain strings between references and taps that are held.

    With current I and the part x of the resistance between two held points below a tap, its variance is
    (sigma I)^2 ((1 - x)^2 S_below + x^2 S_above), S a sum of r^2 of units: for equal units and no leads
    sigma sqrt((k - a) (b - k) / (b - a)) LSB. Source: random walk with pinned ends.
    """
    ladder, bits, lsb = plan.ladder, plan.converter.bits, plan.lsb
    units = unit_resistances(ladder, bits, total_resistance)
    lead = ladder.end_resistance + ladder.reference_resistance
    resistance = units.copy()
    resistance[turns(ladder, bits)] += ladder.turn_resistance
    # The high lead follows the last unit; the low one precedes the first. Tap k lies behind unit k.
    behind = np.concatenate([[lead], lead + np.cumsum(resistance)])
    square = np.concatenate([[0.0], np.cumsum(units**2)])
    pins = [0, *sorted(ladder.forced_taps), units.size]
    variance = np.zeros(units.size + 1)
    for low, high in pairwise(pins):
        start = 0.0 if low == 0 else behind[low]
        end = behind[high] + (lead if high == units.size else 0.0)
        taps = np.arange(max(low, 1), min(high, units.size - 1) + 1)
        part = (behind[taps] - start) / (end - start)
        current = (high - low) * lsb / (end - start)
        below, above = square[taps] - square[low], square[high] - square[taps]
        spread = (1 - part) ** 2 * below + part**2 * above
        variance[taps] = (current * ladder.resistor_sigma) ** 2 * spread
    if ladder.differential:  # two strings of half the span each
        variance *= 2 * 0.5**2
    return np.sqrt(variance[1:-1]) / lsb


def mismatch_covariance(plan: Plan, total_resistance: float) -> Floats:
    """Covariance of all thresholds' errors in LSB^2, (M, M), to first order, of any ladder.

    A resistor that is larger by a part e acts as a voltage source e I r in series with it: by reciprocity the nodes move
    by Z a g e I r, with Z the network's inverse and a where the resistor hangs.
    Source: sensitivity of linear networks; S. W. Director, R. A. Rohrer, IEEE Trans. Circuit Theory 16(3), 1969 (memory).
    """
    quiet = plan.ladder.model_copy(update={"bias_current": 0.0})
    plan = plan.model_copy(update={"ladder": quiet})
    reference = build_reference(plan, Datasheet(), total_resistance)
    sensitivity = _sensitivity(reference) / plan.lsb
    spread = sensitivity * reference.network.resistors.sigma
    return np.asarray(spread @ spread.T)


def _sensitivity(reference: Reference) -> Floats:
    """Movement of each threshold in V for a relative change of each resistor, (M, r)."""
    network: Network = reference.network
    resistors = network.resistors
    current = (
        resistors.free.T @ dc_voltages(network)
        + resistors.held.T @ network.held_voltages()
    ) / resistors.value
    inductors = network.inductors.value.size
    wanted = np.zeros((len(network.names) + inductors, reference.taps.shape[0]))
    wanted[: len(network.names)] = reference.taps.T.toarray()
    # By reciprocity M solutions, one for each threshold, do instead of one for each resistor.
    response = splu(loss_matrix(network)).solve(wanted)
    return np.asarray((resistors.free.T @ response[: len(network.names)]).T * current)
