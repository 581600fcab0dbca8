"""Edges and bubbles against a word-by-word search."""

from collections import Counter
from itertools import groupby

import numpy as np

from flashplan.metrics.bubbles import count_bubbles_by_order, edges


def slow_edge(word):
    mismatches = [
        sum(not bit for bit in word[:edge]) + sum(word[edge:])
        for edge in range(len(word) + 1)
    ]
    return mismatches.index(min(mismatches))


def slow_orders(word):
    edge = slow_edge(word)
    wrong = [bit != (place < edge) for place, bit in enumerate(word)]
    return [len(list(run)) for bad, run in groupby(wrong) if bad]


def test_edges_and_orders_equal_a_search_on_all_words_of_ten_decisions():
    words = (np.arange(1024)[:, None] >> np.arange(10) & 1).astype(bool)
    rows = words.tolist()
    assert edges(words).tolist() == [slow_edge(row) for row in rows]
    expected = Counter(order for row in rows for order in slow_orders(row))
    assert count_bubbles_by_order(words) == dict(expected)


def test_a_run_never_crosses_the_edge():
    words = (np.arange(2**12)[:, None] >> np.arange(12) & 1).astype(bool)
    edge = edges(words)
    inside = (edge > 0) & (edge < 12)
    rows = np.flatnonzero(inside)
    # Both neighbours of the edge wrong would make one run across it.
    assert not np.any(~words[rows, edge[rows] - 1] & words[rows, edge[rows]])


def test_clean_and_missing_words_have_no_bubbles():
    assert count_bubbles_by_order(np.zeros((0, 15), dtype=bool)) == {}
    assert count_bubbles_by_order(np.tri(16, 15, -1).astype(bool)) == {}
