"""Kickback in periodic steady state: what all earlier decisions have left at a tap when the next one falls."""

import numpy as np
from numpy.typing import NDArray

from flashplan.ladder.modes import network_modes
from flashplan.ladder.network import Network
from flashplan.ladder.straight import at_taps, ladder_network
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

# A mode that decays further than this in one clock period leaves nothing to speak of.
_FORGOTTEN = 1e-15


def kickback_per_charge(
    plan: Plan, cell: Datasheet, total_resistance: float | None = None
) -> NDArray[np.float64]:
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
    network = ladder_network(plan, cell, resistance)
    return residue_at_rest(network, plan.comparators, 1.0 / plan.converter.sample_rate)


def residue_at_rest(
    network: Network, comparators: int, period: float
) -> NDArray[np.float64]:
    """As `kickback_per_charge`, of any network whose nodes hold the taps; period in s."""
    modes = network_modes(network, fastest=-np.log(_FORGOTTEN) / period)
    left = np.exp(-modes.rate * period)
    shape = at_taps(network, modes.shape, comparators)
    # Charge below minus charge above tap k, as each mode sees it: a cumulative sum instead of a matrix for each k.
    below = np.cumsum(shape, axis=0)
    pushed = 2.0 * below - shape - below[-1]
    return np.asarray((shape * pushed) @ (left / (1.0 - left)))
