"""Exact transient of a network by its modes: no time step."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cholesky, eig, eigh, eigh_tridiagonal, solve_triangular
from scipy.sparse import csc_array
from scipy.sparse.csgraph import connected_components
from scipy.sparse.linalg import eigs, eigsh, splu

from flashplan.ladder.network import Network
from flashplan.ladder.states import States, network_states

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]

# Up to this many states all modes are worked out; beyond, only those asked for.
_DENSE = 200


@dataclass(frozen=True)
class Modes:
    """The m modes of a network: rate (m,) in 1/s, shape (f, m) of its free nodes; complex where an inductor rings.

    A charge q (f,) pushed into the nodes raises their voltages at time t by Re{shape @ (exp(-rate t) * (shape.T @ q))}.
    """

    rate: NDArray
    shape: NDArray


def network_modes(network: Network, fastest: float = np.inf) -> Modes:
    """Modes of E dx/dt = -A x, whose real rates, in 1/s, do not exceed `fastest`; each tied part of the network by itself.

    Without inductors A and E are symmetric: G x = rate C x, x' C x = 1, real. A chain of nodes in order becomes
    tridiagonal by scaling with sqrt(C) and is solved as such, only for the modes asked for.
    With inductors the modes are complex and orthogonal without conjugation: v' C v - i' L i = 1, since a network of
    R, L and C is reciprocal. Source: modal analysis of linear systems; LAPACK and ARPACK through scipy.
    """
    states = network_states(network)
    count, part = connected_components(
        abs(states.loss) + abs(states.storage), directed=False
    )
    rates, shapes = [], []
    for index in range(count):
        own = np.flatnonzero(part == index)
        inner = States(
            states.storage[own][:, own],
            states.loss[own][:, own],
            states.nodes[:, own],
            int(np.count_nonzero(own >= part.size - states.inductors)),
        )
        rate, vectors = (
            _ringing(inner, fastest) if inner.inductors else _resistive(inner, fastest)
        )
        rates.append(rate)
        shapes.append(np.asarray(inner.nodes @ vectors))
    return Modes(np.concatenate(rates), np.concatenate(shapes, axis=1))


def _resistive(states: States, fastest: float) -> tuple[NDArray, NDArray]:
    own = states.storage.diagonal()
    if (
        own.size > 1
        and _bandwidth(states.storage) == 0
        and _bandwidth(states.loss) == 1
    ):
        root = np.sqrt(own)
        main = states.loss.diagonal() / own
        beside = states.loss.diagonal(1) / (root[:-1] * root[1:])
        if np.isinf(fastest):
            rate, vectors = eigh_tridiagonal(main, beside)
        else:
            rate, vectors = eigh_tridiagonal(
                main, beside, select="v", select_range=(-1.0, fastest)
            )
        return rate, vectors / root[:, None]
    rate, vectors = _slowest(states, fastest, fastest) or eigh(
        states.loss.toarray(), states.storage.toarray()
    )
    kept = rate <= fastest
    return rate[kept], vectors[:, kept]


def _slowest(
    states: States, fastest: float, radius: float
) -> tuple[NDArray, NDArray] | None:
    """All eigenpairs of A x = rate E x with |rate| up to the radius, and some more; None where that is most of them."""
    size = states.loss.shape[0]
    if size <= _DENSE or np.isinf(fastest):
        return None
    # A fixed start with no symmetry of its own, so that no mode is missed and every run gives the same numbers.
    start = np.cos(np.arange(size) ** 2)
    search = eigs if states.inductors else eigsh
    wanted = 24
    while wanted < size // 4:
        rate, vectors = search(
            states.loss, k=wanted, M=states.storage, sigma=0.0, v0=start
        )
        if np.abs(rate).max() > radius:
            return rate, vectors
        wanted *= 2
    return None


def _bandwidth(matrix: csc_array) -> int:
    entries = matrix.tocoo()
    rows, columns = entries.coords
    return int(np.abs(rows - columns)[entries.data != 0].max(initial=0))


def _ringing(states: States, fastest: float) -> tuple[Complexes, Complexes]:
    radius = float(np.hypot(fastest, _highest_frequency(states)))
    rate, vectors = _slowest(states, fastest, radius) or _all(states)
    kept = rate.real <= fastest
    # Complex even if nothing rings: where the magnetic energy is the larger one, the norm is imaginary.
    rate, vectors = rate[kept].astype(complex), vectors[:, kept].astype(complex)
    sign = np.ones(states.loss.shape[0])
    sign[-states.inductors :] = -1.0
    norm = np.einsum("sm,sm->m", vectors, sign[:, None] * (states.storage @ vectors))
    return rate, vectors / np.sqrt(norm)


def _all(states: States) -> tuple[NDArray, NDArray]:
    """All eigenpairs of A x = rate E x, in coordinates of equal energy, in which they are well scaled."""
    root = cholesky(states.storage.toarray(), lower=True)
    half = solve_triangular(root, states.loss.toarray(), lower=True)
    rate, vectors = eig(solve_triangular(root, half.T, lower=True).T)
    return rate, solve_triangular(root, vectors, lower=True, trans="T")


def _highest_frequency(states: States) -> float:
    """Bound of |Im rate|: the largest singular value of C^-1/2 B L^-1/2, with B the inductors' currents into the nodes.

    From the energies of a mode: |Im rate| (v* C v + i* L i) = 2 |Im v* B i|, at most that value times the sum.
    """
    coils = states.inductors
    own = states.storage.diagonal()[-coils:]
    coupling = states.loss[:-coils, -coils:].toarray()
    into = splu(states.storage[:-coils, :-coils].tocsc()).solve(coupling)
    square = coupling.T @ into / np.sqrt(np.multiply.outer(own, own))
    return float(np.sqrt(np.linalg.norm(square, 2)))
