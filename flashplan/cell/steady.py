"""Steady states of many instances of a network at once, by pseudo-transient continuation."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.circuit import (
    Network,
    apply_matrix,
    device_currents,
    with_driven,
)
from flashplan.cell.device import DeviceParameters

Floats = NDArray[np.float64]

_PROBE = 1e-5  # V, of the difference quotients
_SETTLED = 1e-9  # V, last movement of any node


def steady_state(
    network: Network,
    parameters: DeviceParameters,
    driven: Floats,
    start: Floats,
    first_step: float,
    duration: float = np.inf,
    limit: int = 800,
) -> tuple[Floats, NDArray[np.bool_]]:
    """Free nodes at rest with constant driven nodes: (voltages (free, instances), failed (instances,)).

    duration: s, after which an instance is taken as it is, at rest or not. driven: (driven, instances); start: (free, instances); first_step: s, short against the circuit's time constants.
    Linearly implicit Euler steps whose length grows as the rates fall: the path first follows the circuit's own
    transient, so that of several stable states the one is found that the circuit would fall into from `start`.
    An instance that has not come to rest after `limit` steps counts as failed.
    Source: C. T. Kelley, D. E. Keyes, "Convergence analysis of pseudo-transient continuation", SIAM J. Numer. Anal.
    35(2), 1998 (memory).
    """
    free, instances = start.shape
    state = np.array(start, dtype=float)
    step = np.full(instances, first_step)
    limit_move = 0.05 * network.supply
    settled = np.zeros(instances, dtype=bool)
    elapsed = np.zeros(instances)
    tiled = replace(
        parameters,
        **{
            name: np.tile(values, (1, free)) if values.shape[1] > 1 else values
            for name, values in vars(parameters).items()
        },
    )
    rates = _rates(network, parameters, driven, state)
    size = np.abs(rates).max(axis=0)
    for _ in range(limit):
        matrix = -jacobian_of(network, tiled, driven, state)
        matrix += np.eye(free) / step[:, None, None]
        move = np.linalg.solve(matrix, rates.T[:, :, None])[:, :, 0].T
        largest = np.abs(move).max(axis=0)
        # A step against the rates is one too long for a growing mode: it would return to the balance being left.
        onward = (move * rates).sum(axis=0) >= 0.0
        taken = onward & (largest < limit_move) & ~settled
        state = np.where(taken, state + move, state)
        elapsed += np.where(taken, step, 0.0)
        rates = _rates(network, parameters, driven, state)
        new = np.abs(rates).max(axis=0)
        step *= np.where(taken & (new < 1.6 * size), 2.5, 0.4)
        step = np.minimum(step, 1e9 * first_step)
        step = np.where(elapsed < duration, np.minimum(step, duration), step)
        size = new
        # Rates also fall to a crawl beside a balance; only a long step shows that nothing moves any more.
        settled |= taken & (largest < _SETTLED) & (step > 1e6 * first_step)
        settled |= elapsed >= duration
        if settled.all():
            break
    return state, ~settled | ~np.isfinite(state).all(axis=0)


def _rates(
    network: Network, parameters: DeviceParameters, driven: Floats, free: Floats
) -> Floats:
    full = with_driven(free, driven)
    rates = apply_matrix(
        network.from_current, device_currents(network, parameters, full)
    )
    if network.circuit.resistors:
        rates += apply_matrix(network.from_voltage, full)
    return rates


def jacobian_of(
    network: Network, tiled: DeviceParameters, driven: Floats, state: Floats
) -> Floats:
    """Derivatives of all rates by all free nodes, (instances, free, free), by central differences in one evaluation.

    tiled: the parameters of all instances, repeated for each free node.
    """
    free, instances = state.shape
    step = _PROBE * np.repeat(np.eye(free), instances, axis=1)
    there = np.tile(state, (1, free))
    given = np.tile(np.broadcast_to(driven, (driven.shape[0], instances)), (1, free))
    change = device_currents(
        network, tiled, with_driven(there + step, given)
    ) - device_currents(network, tiled, with_driven(there - step, given))
    slope = change.reshape(-1, free, instances) / (2.0 * _PROBE)
    equation = "rd,dcm->mrc" if network.from_current.ndim == 2 else "mrd,dcm->mrc"
    jacobian = np.einsum(equation, network.from_current, slope)
    if network.circuit.resistors:
        jacobian = jacobian + network.from_voltage[..., :free]
    return np.asarray(jacobian)
