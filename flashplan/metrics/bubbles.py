"""Bubbles of thermometer words, by order."""

import numpy as np
from numpy.typing import NDArray

_CHUNK = 2**22  # decisions looked at together


def count_bubbles_by_order(words: NDArray[np.bool_]) -> dict[int, int]:
    """Number of bubbles of each order in thermometer words (n, M), lowest threshold first.

    The edge of a word is where a clean word differs from it in the fewest places, the lowest of several; a bubble is a
    run of decisions that differ, its order the run's length.
    Source: common practice; order as in the usual vocabulary (a lone wrong decision is of first order).

    >>> count_bubbles_by_order(np.array([[1, 0, 1, 1, 0, 0]], dtype=bool))
    {1: 1}
    """
    found = np.zeros(words.shape[1] + 2, dtype=np.int64)
    rows = max(1, _CHUNK // max(1, words.shape[1]))
    for start in range(0, words.shape[0], rows):
        part = words[start : start + rows]
        ones = np.cumsum(part, axis=1, dtype=np.int64)
        # Differences from a clean word with e ones: zeros below the edge and ones above it.
        edges = np.arange(part.shape[1] + 1)
        below = np.concatenate(
            [np.zeros((part.shape[0], 1), dtype=np.int64), ones], axis=1
        )
        edge = (edges - 2 * below).argmin(axis=1)
        wrong = part != (edges[:-1] < edge[:, None])
        step = np.diff(wrong.astype(np.int8), axis=1, prepend=0, append=0)
        first, last = np.nonzero(step == 1), np.nonzero(step == -1)
        found += np.bincount(last[1] - first[1], minlength=found.size)
    return {order: int(count) for order, count in enumerate(found) if count}
