"""Fault maps against a search over every word of a small converter."""

import json

import numpy as np
import pytest

from flashplan.decoder import decode, fault_maps
from flashplan.decoder.fault_map import bubble_words, guarantees
from flashplan.decoder.schemes import SCHEMES


@pytest.mark.parametrize("name", SCHEMES)
def test_first_order_errors_are_the_worst_of_all_words_with_one_flip(name):
    maps = fault_maps(4, farthest=4)
    for column, distance in enumerate(maps.distances):
        worst = 0
        for edge in range(16):
            # Threshold edge + d is wrong above the edge, edge + d + 1 below it (d negative).
            threshold = edge + distance if distance > 0 else edge + distance + 1
            if not 1 <= threshold <= 15:
                continue
            word = np.arange(15) < edge
            word[threshold - 1] ^= True
            error = abs(int(decode(name, word[None])[0]) - int(word.sum()))
            worst = max(worst, error)
        assert maps.errors[name][0, column] == worst


def test_bubbles_have_their_order_and_keep_their_distance():
    words = bubble_words(4, 2, 3)
    edges = np.argmin(words, axis=1)
    wrong = words ^ (np.arange(15) < edges[:, None])
    assert (wrong.sum(axis=1) == 2).all()
    assert (wrong.argmax(axis=1) - edges == 2).all()


def test_counting_never_fails_and_a_majority_repairs_lone_bubbles():
    promised = guarantees(fault_maps(5))
    assert promised["ones-counter"] == [0, 0, 0, 0]
    # A lone bubble is outvoted, and its one decision is what the count differs by.
    assert promised["majority-rom"][0] <= 1
    assert promised["rom"][0] > 2


def test_bubbles_that_do_not_fit_are_null_in_json():
    maps = json.loads(json.dumps(fault_maps(2).to_dict()))
    assert maps["errors"]["rom"][3] == [None] * len(maps["distances"])
