"""How a network answers a charge in time: by its modes, or step by step with a controlled error where an inductor rings."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.sparse.linalg import splu

from flashplan.ladder.modes import network_modes
from flashplan.ladder.network import Network
from flashplan.ladder.states import network_states

Floats = NDArray[np.float64]

# A mode that has decayed by exp(-35) leaves nothing of double precision.
SPENT = 35.0
# Five stages of one diagonal, of order 4, stiffly accurate and L-stable; and what an embedded order 3 differs by.
_DIAGONAL = 1 / 4
_STAGES = (
    np.array([]),
    np.array([1 / 2]),
    np.array([17 / 50, -1 / 25]),
    np.array([371 / 1360, -137 / 2720, 15 / 544]),
    np.array([25 / 24, -49 / 48, 125 / 16, -85 / 12]),
)
_WEIGHTS = np.append(_STAGES[-1], _DIAGONAL)
_DIFFERENCE = _WEIGHTS - np.array([59 / 48, -17 / 96, 225 / 32, -85 / 12, 0.0])
_FINEST = 50  # halvings of an interval


def charge_response(network: Network, charge: Floats, times: Floats) -> Floats:
    """Voltages (t, f) of the free nodes at increasing times > 0, in s, after a charge (f,) in C at time 0.

    The charge goes into nodes with a capacitance. Exact where the network has no inductor.
    """
    respond = stepped_response if network.inductors.value.size else modal_response
    return respond(network, charge, times)


def modal_response(network: Network, charge: Floats, times: Floats) -> Floats:
    """As `charge_response`, by modes."""
    modes = network_modes(network, fastest=SPENT / float(times[0]))
    left = np.exp(-np.multiply.outer(times, modes.rate))
    return np.asarray(((left * (modes.shape.T @ charge)) @ modes.shape.T).real)


def stepped_response(
    network: Network, charge: Floats, times: Floats, tolerance: float = 1e-8
) -> Floats:
    """As `charge_response`, by an implicit method of fourth order, L-stable, whose error the energy's norm controls.

    tolerance: error of one step against the charge's own sqrt(x' E x). A passive network lets no error grow, so that
    the errors of all steps at most add. Steps are halvings of the intervals between times, so that factors are reused.
    Source: E. Hairer, G. Wanner, "Solving Ordinary Differential Equations II", Springer, SDIRK method of order 4
    (coefficients from memory; a test checks the order conditions).
    """
    states = network_states(network)
    storage, loss = states.storage, states.loss

    def norm(x: Floats) -> float:
        return float(np.sqrt(x @ (storage @ x)))

    factors: dict[float, Callable[[Floats], Floats]] = {}

    def step(x: Floats, h: float) -> tuple[Floats, float]:
        if h not in factors:
            factors[h] = splu((storage + _DIAGONAL * h * loss).tocsc()).solve
        solve = factors[h]
        slopes = np.empty((len(_STAGES), x.size))
        for stage, row in enumerate(_STAGES):
            slopes[stage] = solve(-(loss @ (x + h * (row @ slopes[:stage]))))
        # Through one more solution, which keeps what decays within the step from being taken for an error.
        error = solve(storage @ (h * (_DIFFERENCE @ slopes)))
        return x + h * (_WEIGHTS @ slopes), norm(error)

    x = splu(storage).solve(states.nodes.T @ charge)
    allowed = tolerance * norm(x)
    out = np.empty((times.size, states.nodes.shape[0]))
    level = _FINEST // 2
    for index, interval in enumerate(np.diff(times, prepend=0.0)):
        done = 0  # in units of the finest step
        while done < 2**_FINEST:
            end, error = step(x, float(interval) / 2**level)
            if error > allowed and level < _FINEST:
                level += 1
                continue
            x = end
            done += 2 ** (_FINEST - level)
            # The error falls with the cube of the step; a longer one must start on its own grid.
            if (
                level
                and error < allowed / 10
                and done % 2 ** (_FINEST - level + 1) == 0
            ):
                level -= 1
        out[index] = states.nodes @ x
    return out
