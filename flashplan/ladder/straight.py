"""The plan's reference ladder as a network: leads, units, taps, what hangs on each tap."""

from itertools import pairwise

import numpy as np

from flashplan.ladder.network import GROUND, Network, Part, build_network
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

INPUT = "input"


def tap(k: int) -> str:
    """Node name of tap k, from 1."""
    return f"tap {k}"


def ladder_network(plan: Plan, cell: Datasheet, total_resistance: float) -> Network:
    """Network of a straight ladder with the plan's leads, capacitances, bias currents and forced taps.

    2**bits equal units make up total_resistance; the leads come on top. Each tap has the plan's capacitance to ground
    and the cell's coupling capacitance to the input node, none where the cell does not give it.
    """
    ladder = plan.ladder
    units = 2**plan.converter.bits
    unit = total_resistance / units
    chain = ["bottom", *(tap(k) for k in range(1, units)), "top"]
    parts = [
        Part("voltage", "bottom", GROUND, 0.0, "bottom reference"),
        Part("voltage", "top", GROUND, plan.converter.full_scale, "top reference"),
        Part("voltage", INPUT, GROUND, 0.0, "signal input"),
    ]
    for k, (low, high) in enumerate(pairwise(chain), 1):
        # A lead is in series with the end unit: one part, so that no node is left without a capacitance.
        lead = ladder.end_resistance if k in (1, units) else 0.0
        parts.append(Part("resistor", low, high, unit + lead, f"ladder unit {k}"))
    for k in ladder.forced_taps:
        parts.append(Part("voltage", tap(k), GROUND, k * plan.lsb, f"forced tap {k}"))
    forced = set(ladder.forced_taps)
    for k in range(1, units):
        if k in forced:
            continue
        parts.append(
            Part(
                "capacitor",
                tap(k),
                GROUND,
                ladder.tap_capacitance,
                f"capacitance of tap {k}",
            )
        )
        if cell.coupling_capacitance:
            parts.append(
                Part(
                    "capacitor",
                    tap(k),
                    INPUT,
                    cell.coupling_capacitance,
                    f"coupling to tap {k}",
                )
            )
        if ladder.bias_current:
            parts.append(
                Part(
                    "current",
                    tap(k),
                    GROUND,
                    ladder.bias_current,
                    f"bias current of tap {k}",
                )
            )
    return build_network(parts)


def at_taps(
    network: Network,
    values: np.ndarray,
    comparators: int,
    held: np.ndarray | float = 0.0,
) -> np.ndarray:
    """Values of free nodes (f, ...) put in the order of the taps, (comparators, ...); held taps get `held`."""
    place = {name: index for index, name in enumerate(network.names)}
    out = np.zeros((comparators, *values.shape[1:]), dtype=values.dtype)
    out[...] = held
    for k in range(1, comparators + 1):
        if tap(k) in place:
            out[k - 1] = values[place[tap(k)]]
    return out
