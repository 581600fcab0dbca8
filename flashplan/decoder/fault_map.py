"""Fault maps: what one bubble of a given order costs each scheme, by how far from the edge it sits."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder.evaluate import compile_netlist, evaluate
from flashplan.decoder.schemes import SCHEMES
from flashplan.decoder.words import clean_words

ORDERS = (1, 2, 3, 4)


@dataclass(frozen=True)
class FaultMaps:
    """Largest errors in LSB against the number of ones, over all edges, by bubble order and place.

    distances: (d,), one more than the right decisions between edge and bubble; negative for missing ones below the
    edge, positive for stray ones above it. errors: per scheme (orders, d), NaN where no word has such a bubble.
    """

    bits: int
    orders: tuple[int, ...]
    distances: NDArray[np.int64]
    errors: dict[str, NDArray[np.float64]]

    def to_dict(self) -> dict[str, Any]:
        """Plain types for JSON; null where no word has such a bubble."""
        return {
            "bits": self.bits,
            "orders": list(self.orders),
            "distances": self.distances.tolist(),
            "errors": {
                name: [
                    [None if np.isnan(value) else value for value in row]
                    for row in errors.tolist()
                ]
                for name, errors in self.errors.items()
            },
        }


def fault_maps(bits: int, farthest: int = 8) -> FaultMaps:
    """Every word with one bubble of order 1 .. 4 up to `farthest` decisions from its edge, through every scheme's gates.

    The edge is that of the clean word that the bubble was put into. A bubble at distance 1 would only move the edge, so
    distances start at 2.
    """
    reach = min(farthest, 2**bits - 1)
    distances = np.array([d for d in range(-reach, reach + 1) if abs(d) >= 2])
    shape = (len(ORDERS), distances.size)
    errors = {name: np.full(shape, np.nan) for name in SCHEMES}
    programs = {
        name: compile_netlist(scheme.build(bits)) for name, scheme in SCHEMES.items()
    }
    for place in np.ndindex(shape):
        words = bubble_words(bits, ORDERS[place[0]], int(distances[place[1]]))
        if not words.size:
            continue
        passed = words.sum(axis=1)
        for name, program in programs.items():
            found = np.abs(evaluate(program, words) - passed)
            errors[name][place] = found.max()
    return FaultMaps(bits, ORDERS, distances, errors)


def bubble_words(bits: int, order: int, distance: int) -> NDArray[np.bool_]:
    """All words with one bubble: `order` flipped decisions, the nearest to the edge `abs(distance)` from it.

    distance 2 leaves one right decision between the edge and stray ones above it, -2 one between it and missing ones.

    >>> bubble_words(2, 1, 2).astype(int).tolist()
    [[0, 1, 0], [1, 0, 1]]
    """
    width = 2**bits - 1
    edge = np.arange(width + 1)
    first = edge + distance - 1 if distance > 0 else edge + distance - order + 1
    fits = (first >= 0) & (first + order <= width)
    first = first[fits, None]
    column = np.arange(width)
    return clean_words(width)[fits] ^ ((column >= first) & (column < first + order))


def guarantees(maps: FaultMaps, within: int = 3) -> dict[str, list[int]]:
    """Per scheme and order, the most that one bubble within so many decisions of the edge can cost, in LSB.

    A bound by exhaustion: `maps` holds every such word.
    """
    near = np.abs(maps.distances) <= within
    return {
        name: [int(worst) for worst in np.nanmax(errors[:, near], axis=1, initial=0)]
        for name, errors in maps.errors.items()
    }
