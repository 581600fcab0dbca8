"""Bubbles in thermometer words: where the edge is, and which runs of decisions disagree with it."""

import numpy as np
from numpy.typing import NDArray

Words = NDArray[np.bool_]

# Decisions looked at in one go; bounds the memory whatever the number of words.
_BLOCK = 2**22


def edges(words: Words) -> NDArray[np.int64]:
    """Edge of each word (n,): the code whose clean word differs in the fewest decisions; the lowest of equals.

    words: (n, M) bool, lowest threshold first.

    >>> edges(np.array([[1, 1, 0, 1, 0, 0, 0]], dtype=bool)).tolist()
    [2]
    """
    # With the edge at c, the zeros below it and the ones above it are wrong: up to a constant, a walk that steps down at
    # each one and up at each zero.
    walk = np.zeros((words.shape[0], words.shape[1] + 1), dtype=np.int32)
    np.cumsum(np.where(words, -1, 1), axis=1, out=walk[:, 1:])
    return walk.argmin(axis=1)


def count_bubbles_by_order(words: Words) -> dict[int, int]:
    """Number of bubbles of each order in words (n, M) bool, lowest threshold first.

    A bubble is a run of decisions that all disagree with the word's edge, bounded by decisions that agree or by the
    word's ends; its order is the length of the run. A run may not cross the edge, as it would move it.

    >>> count_bubbles_by_order(np.array([[1, 1, 0, 1, 0, 0, 0]], dtype=bool))
    {1: 1}
    """
    width = words.shape[1]
    counts = np.zeros(width + 1, dtype=np.int64)
    step = max(1, _BLOCK // max(width, 1))
    for start in range(0, words.shape[0], step):
        part = words[start : start + step]
        wrong = part ^ (np.arange(width) < edges(part)[:, None])
        framed = np.zeros((part.shape[0], width + 2), dtype=np.int8)
        framed[:, 1:-1] = wrong
        change = np.diff(framed, axis=1).ravel()
        orders = np.flatnonzero(change == -1) - np.flatnonzero(change == 1)
        counts += np.bincount(orders, minlength=width + 1)
    return {int(order): int(counts[order]) for order in np.flatnonzero(counts)}
