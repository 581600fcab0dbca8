"""What a network remembers: the voltages of its capacitances and the currents of its inductances, all else eliminated."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_array
from scipy.sparse.linalg import splu

from flashplan.ladder.network import Network, loss_matrix, storage_matrix

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class States:
    """E dx/dt = -A x of s states: the free nodes with a capacitance in their order, then the l inductors.

    storage: E, loss: A, both (s, s). nodes: (f, s) voltages of all free nodes of the network from the states.
    inductors: l. Without an inductor A and E are symmetric; an inductor's row of A has the opposite sign of its column.
    """

    storage: csc_array
    loss: csc_array
    nodes: csc_array
    inductors: int


def network_states(network: Network) -> States:
    """Eliminate the nodes without a capacitance, whose voltages follow the others at once.

    Source: Schur complement, in networks known as Kron reduction.
    """
    loss, storage = loss_matrix(network), storage_matrix(network)
    inductors = network.inductors.value.size
    free = len(network.names)
    remembers = storage.diagonal() > 0
    slack = np.flatnonzero(~remembers)
    kept = np.flatnonzero(remembers)
    follow = csc_array((slack.size, kept.size))
    inner = loss[kept][:, kept]
    if slack.size:
        solved = splu(loss[slack][:, slack].tocsc()).solve(
            loss[slack][:, kept].toarray()
        )
        follow = csc_array(-solved)
        inner = inner + loss[kept][:, slack] @ follow
    identity = csc_array(
        (np.ones(kept.size), (kept, np.arange(kept.size))),
        shape=(remembers.size, kept.size),
    )
    spread = csc_array(
        (np.ones(slack.size), (slack, np.arange(slack.size))),
        shape=(remembers.size, slack.size),
    )
    return States(
        csc_array(storage[kept][:, kept]),
        csc_array(inner),
        csc_array((identity + spread @ follow)[:free]),
        inductors,
    )
