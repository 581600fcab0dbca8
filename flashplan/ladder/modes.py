"""Exact transient of a network by its modes: no time step."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cholesky, eig, eigh, eigh_tridiagonal, solve_triangular
from scipy.sparse import csc_array
from scipy.sparse.csgraph import connected_components
from scipy.sparse.linalg import LinearOperator, eigs, eigsh, splu

from flashplan.ladder.network import Network
from flashplan.ladder.states import States, network_states

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]

# Up to this many states all modes are worked out; beyond, only those asked for.
_DENSE = 300


@dataclass(frozen=True)
class Modes:
    """The m modes of a network: rate (m,) in 1/s, shape and dual (f, m) of its free nodes; complex where an inductor rings.

    A charge q (f,) pushed into the nodes raises their voltages at time t by Re{shape @ (exp(-rate t) * (dual.T @ q))}.
    """

    rate: NDArray
    shape: NDArray
    dual: NDArray


def network_modes(network: Network, fastest: float = np.inf) -> Modes:
    """Modes of E dx/dt = -A x, whose real rates, in 1/s, do not exceed `fastest`; each tied part of the network by itself.

    Without inductors A and E are symmetric: G x = rate C x, x' C x = 1, real. A chain of nodes in order becomes
    tridiagonal by scaling with sqrt(C) and is solved as such, only for the modes asked for.
    With inductors the modes are complex and orthogonal without conjugation in v' C v - i' L i, since a network of R, L
    and C is reciprocal. Source: modal analysis of linear systems; LAPACK and ARPACK through scipy.
    """
    states = network_states(network)
    count, part = connected_components(
        abs(states.loss) + abs(states.storage), directed=False
    )
    rates, shapes, duals = [], [], []
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
        kept = rate.real <= fastest
        rates.append(rate[kept])
        shapes.append(np.asarray(inner.nodes @ vectors[:, kept]))
        duals.append(
            np.asarray(inner.nodes @ _duals(inner, vectors[:, kept]))
            if inner.inductors
            else shapes[-1]
        )
    return Modes(
        np.concatenate(rates),
        np.concatenate(shapes, axis=1),
        np.concatenate(duals, axis=1),
    )


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
    if own.size > _DENSE and np.isfinite(fastest):
        wanted = 24
        while wanted < own.size // 4:
            rate, vectors = eigsh(
                states.loss,
                k=wanted,
                M=states.storage,
                sigma=0.0,
                v0=_start(own.size, 0),
            )
            if rate.max() > fastest:
                return rate, vectors
            wanted *= 2
    rate, vectors = eigh(states.loss.toarray(), states.storage.toarray())
    return rate, vectors


def _start(size: int, turn: int) -> Floats:
    """A start of a search with no symmetry of its own, so that no mode is missed and every run gives the same numbers."""
    return np.cos((np.arange(size) + np.pi * turn) ** 2)


def _bandwidth(matrix: csc_array) -> int:
    entries = matrix.tocoo()
    rows, columns = entries.coords
    return int(np.abs(rows - columns)[entries.data != 0].max(initial=0))


def _ringing(states: States, fastest: float) -> tuple[NDArray, NDArray]:
    """Eigenpairs of A x = rate E x: all of them, or at least those with Re rate <= fastest.

    The largest magnitude of such a rate follows from both bounds. Rates are found slowest first, two dozen at a time,
    those found taken out of the next search, until one finds none: two ends that ring alike and hardly see each other
    share a rate, of which a single search need not find both modes.
    """
    size = states.loss.shape[0]
    if size <= _DENSE or np.isinf(fastest):
        return _all(states)
    radius = np.hypot(fastest, _highest_frequency(states))
    solve = splu(states.loss).solve
    signs = _signs(states)
    rate, vectors = np.empty(0, dtype=complex), np.empty((size, 0), dtype=complex)
    while rate.size < size // 4:
        duals = _duals(states, vectors)
        scaled = vectors / rate

        def rest(x: NDArray, found: NDArray = scaled, dual: NDArray = duals) -> NDArray:
            stored = np.asarray(states.storage @ x.ravel())
            back: NDArray = solve(stored.real) + 1j * solve(stored.imag)
            return back - found @ (dual.T @ (signs * stored))

        search = LinearOperator((size, size), matvec=rest, dtype=complex)
        start = _start(size, rate.size).astype(complex)
        slowness, more = eigs(search, k=24, v0=start)
        near = np.abs(slowness) >= 1 / radius
        if not near.any():
            return rate, vectors
        rate = np.concatenate([rate, 1 / slowness[near]])
        vectors = np.concatenate([vectors, more[:, near]], axis=1)
    return _all(states)


def _signs(states: States) -> Floats:
    signs = np.ones(states.loss.shape[0])
    signs[signs.size - states.inductors :] = -1.0
    return signs


def _duals(states: States, vectors: NDArray) -> NDArray:
    """Vectors y with y_j' S E x_k = 1 for j = k and 0 else, S the signs; modes of the same rate are told apart so."""
    stored: NDArray = np.asarray(states.storage @ vectors) * _signs(states)[:, None]
    return np.linalg.solve(vectors.T @ stored, vectors.T).T


def _all(states: States) -> tuple[NDArray, NDArray]:
    """All eigenpairs of A x = rate E x, in coordinates of equal energy, in which they are well scaled."""
    root = cholesky(states.storage.toarray(), lower=True)
    half = solve_triangular(root, states.loss.toarray(), lower=True)
    rate, vectors = eig(solve_triangular(root, half.T, lower=True).T)
    # Complex even if nothing rings, since where magnetic energy is the larger one, a norm is imaginary.
    vectors = solve_triangular(root, vectors, lower=True, trans="T")
    return rate, vectors.astype(complex)


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
