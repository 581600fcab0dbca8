"""Integrals of a smooth function over a moving band, as one matrix on panels of Gauss nodes."""

import itertools
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Panels:
    """Gauss-Legendre nodes and weights on adjoining panels. edges (p + 1,), orders (p,), nodes and weights (n,)."""

    edges: Array
    orders: tuple[int, ...]
    nodes: Array
    weights: Array


def make_panels(
    half: float, breaks: Iterable[float], width: float, nodes_per_width: float
) -> Panels:
    """Cut [-half, half] at every break (taken with both signs) and give each panel nodes for its length.

    width: length over which the integrands change by their own size; panels are cut to at most 5 of it. A panel gets
    nodes_per_width nodes for each width, and for two widths more.
    """
    inner = [b for b in breaks if 0 <= abs(b) < half]
    marks = np.unique(np.round(np.array([half, *inner]) / half, 12)) * half
    marks = np.unique(np.concatenate([-marks, marks]))
    edges: list[float] = [marks[0]]
    for left, right in itertools.pairwise(marks):
        pieces = max(1, int(np.ceil((right - left) / (5.0 * width))))
        edges.extend(np.linspace(left, right, pieces + 1)[1:])
    lengths = np.diff(edges)
    orders = tuple(
        int(np.ceil(nodes_per_width * (2.0 + size / width))) for size in lengths
    )
    nodes = [
        left + 0.5 * size * (1 + gauss_legendre(order)[0])
        for left, size, order in zip(edges[:-1], lengths, orders, strict=True)
    ]
    weights = [
        0.5 * size * gauss_legendre(order)[1]
        for size, order in zip(lengths, orders, strict=True)
    ]
    return Panels(
        np.array(edges), orders, np.concatenate(nodes), np.concatenate(weights)
    )


def band_matrix(panels: Panels, lower: Array, upper: Array) -> Array:
    """Return K with K @ f(nodes) = integral of f from lower to upper, one row for each pair of limits: (rows, n).

    On each panel f is the polynomial through its nodes, integrated exactly up to the limits, so the error is that of
    the interpolation alone however a limit cuts the panel. Limits beyond the panels are cut there; a row with
    upper <= lower is zero.
    """
    matrix = np.empty((len(lower), len(panels.nodes)))
    column = 0
    for left, right, order in zip(
        panels.edges[:-1], panels.edges[1:], panels.orders, strict=True
    ):
        middle, half = 0.5 * (left + right), 0.5 * (right - left)
        to = np.clip((upper - middle) / half, -1.0, 1.0)
        since = np.clip((lower - middle) / half, -1.0, 1.0)
        rise = _antiderivatives(np.maximum(to, since), order) - _antiderivatives(
            since, order
        )
        matrix[:, column : column + order] = half * (rise @ gauss_legendre(order)[2])
        column += order
    return matrix


@cache
def gauss_legendre(order: int) -> tuple[Array, Array, Array]:
    """Nodes and weights on [-1, 1], and the matrix from values at the nodes to Legendre coefficients."""
    nodes, weights = np.polynomial.legendre.leggauss(order)
    degree = np.arange(order)[:, np.newaxis]
    legendre = np.polynomial.legendre.legvander(nodes, order - 1).T
    return nodes, weights, (degree + 0.5) * legendre * weights


def _antiderivatives(t: Array, order: int) -> Array:
    """Integrals of the first Legendre polynomials from -1 to t: (len(t), order)."""
    legendre = np.polynomial.legendre.legvander(t, order)
    result = np.empty((len(t), order))
    result[:, 0] = t + 1.0
    degree = np.arange(1, order)
    result[:, 1:] = (legendre[:, 2:] - legendre[:, :-2]) / (2 * degree + 1)
    return result
