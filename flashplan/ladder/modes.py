"""Exact transient of a symmetric RC network by its modes: no time step."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh, eigh_tridiagonal

from flashplan.ladder.network import Network

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Modes:
    """Modes of C dv/dt = -G v, the slowest first: rate (f,) in 1/s, shape (f, f) with shape.T C shape = 1.

    A charge q (f,) pushed into the nodes raises the voltages at time t by shape @ (exp(-rate t) * (shape.T @ q)).
    """

    rate: Floats
    shape: Floats


def network_modes(network: Network, fastest: float = np.inf) -> Modes:
    """Solve the generalised symmetric eigenproblem G x = rate C x; every free node must have a capacitance.

    fastest: leave out modes with a rate above it, in 1/s, which spares their work where the network is a chain.
    A chain of nodes in order with capacitance to held nodes only is tridiagonal after scaling by sqrt(C), and is solved
    as such. Source: modal analysis of symmetric linear systems; LAPACK through scipy.linalg.
    """
    conductance, capacitance = network.conductance, network.capacitance
    own = capacitance.diagonal()
    diagonal_only = capacitance.nnz == np.count_nonzero(own)
    if diagonal_only and _is_tridiagonal(network):
        root = np.sqrt(own)
        main = conductance.diagonal() / own
        beside = conductance.diagonal(1) / (root[:-1] * root[1:])
        if np.isinf(fastest):
            rate, vectors = eigh_tridiagonal(main, beside)
        else:
            rate, vectors = eigh_tridiagonal(
                main, beside, select="v", select_range=(0.0, fastest)
            )
        return Modes(np.asarray(rate, dtype=float), vectors / root[:, None])
    rate, shape = eigh(conductance.toarray(), capacitance.toarray())
    kept = rate <= fastest
    return Modes(
        np.asarray(rate[kept], dtype=float), np.asarray(shape[:, kept], dtype=float)
    )


def _is_tridiagonal(network: Network) -> bool:
    entries = network.conductance.tocoo()
    return network.conductance.shape[0] > 1 and bool(
        np.all(np.abs(entries.coords[0] - entries.coords[1]) <= 1)
    )
