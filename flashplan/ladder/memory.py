"""Kickback for any sequence of codes: the ladder remembers earlier decisions, mode by mode."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from flashplan.ladder.kickback import threshold_shapes
from flashplan.ladder.modes import network_modes
from flashplan.ladder.reference import build_reference
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

# Modes of which one clock period leaves less are forgotten.
_FORGOTTEN = 1e-9


@dataclass(frozen=True)
class KickbackMemory:
    """The m modes that outlive a clock period.

    decay: (m,) what a period leaves of each. shape: (M, m) thresholds in LSB. pushed: (M + 1, m) by code, what the
    decisions of a thermometer word with that many ones add to each. Complex where an inductor rings.
    """

    decay: NDArray
    shape: NDArray
    pushed: NDArray


def kickback_memory(
    plan: Plan, cell: Datasheet, total_resistance: float | None = None
) -> KickbackMemory | None:
    """What the plan's ladder remembers, None where the cell gives no kickback charge.

    total_resistance: instead of the plan's, in ohm.
    """
    if cell.kickback_charge is None:
        return None
    resistance = (
        float(plan.ladder.total_resistance)
        if total_resistance is None
        else total_resistance
    )
    reference = build_reference(plan, cell, resistance)
    period = 1.0 / plan.converter.sample_rate
    modes = network_modes(reference.network, fastest=-np.log(_FORGOTTEN) / period)
    shape = threshold_shapes(reference, modes)
    ones = np.concatenate([np.zeros((1, shape.shape[1])), np.cumsum(shape, axis=0)])
    pushed = cell.kickback_charge * reference.split * (2.0 * ones - ones[-1])
    return KickbackMemory(np.exp(-modes.rate * period), shape / plan.lsb, pushed)


def disturbance(
    memory: KickbackMemory,
    codes: Integers,
    first: Integers,
    width: int,
    before: NDArray | None = None,
) -> tuple[Floats, NDArray]:
    """Movement of the thresholds near the input that all earlier decisions have left, in LSB: (n, width).

    codes: (n,) ones decided at each sample. first: (n,) threshold k in column 0, from 1; columns outside 1..M get 0.
    before: state of the modes that the samples before these have left, as returned beside the result, so that blocks of
    any size give the same numbers; at rest with nothing pushed where not given.

    Between edges each mode a follows a[n] = d (a[n-1] + pushed[codes[n-1]]): the decision of sample n does not feel its
    own charges. The cost is n m width, whatever the number of thresholds. Source: exact discretisation of a first-order
    recursion, run as a recursive filter.
    """
    count, modes = memory.shape.shape
    state = np.empty((codes.size, modes), dtype=memory.shape.dtype)
    after = np.zeros(modes, dtype=memory.shape.dtype) if before is None else before
    last = np.empty_like(after)
    for index, decay in enumerate(memory.decay):
        state[:, index], (last[index],) = lfilter(
            [0.0, decay],
            [1.0, -decay],
            memory.pushed[codes, index],
            zi=after[index : index + 1],
        )
    out = np.empty((codes.size, width))
    for column in range(width):
        threshold = first + column
        near = memory.shape[np.clip(threshold - 1, 0, count - 1)]
        moved = np.einsum("nm,nm->n", state, near).real
        out[:, column] = np.where((threshold >= 1) & (threshold <= count), moved, 0.0)
    return out, last
