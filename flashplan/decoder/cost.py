"""What a decoder costs to run: how often its nets switch on the run's own words, and the energy of that."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder.evaluate import Lanes, Program, run_all

# Columns of 64 words whose nets are all held at once.
_COLUMNS = 64


@dataclass(frozen=True)
class PackedWords:
    """Clean and bubbly words as bit rows, with how often each clean one came: shared by all schemes."""

    clean: Lanes
    clean_counts: NDArray[np.int64]
    bubbly: Lanes
    bubbly_count: int


def transitions_per_word(program: Program, words: PackedWords) -> float:
    """Mean number of gate outputs that change from one conversion to the next.

    Sum over gates of 2 p (1 - p), with p the share of words for which the output is 1: successive words are taken as
    independent draws from the run, as they are for an input near the sample rate; a slow input switches fewer gates.
    Glitches are not counted.
    Source: F. N. Najm, "A survey of power estimation techniques in VLSI circuits", IEEE Trans. VLSI Systems 2(4), 1994
    (memory).
    """
    total = int(words.clean_counts.sum()) + words.bubbly_count
    if total == 0:
        return 0.0
    ones = np.zeros(len(program.steps))
    for index, row in enumerate(run_all(program, words.clean)[program.inputs :]):
        level = np.unpackbits(row.view(np.uint8), bitorder="little")
        ones[index] = level[: words.clean_counts.size] @ words.clean_counts
    for start in range(0, words.bubbly.shape[1], _COLUMNS):
        part = words.bubbly[:, start : start + _COLUMNS]
        valid = _valid(words.bubbly_count - 64 * start, part.shape[1])
        for index, row in enumerate(run_all(program, part)[program.inputs :]):
            ones[index] += np.bitwise_count(row & valid).sum()
    share = ones / total
    return float(np.sum(2 * share * (1 - share)))


def _valid(words: int, columns: int) -> Lanes:
    """Bit rows (columns,) with a 1 for each of the first so many words."""
    level = np.arange(64 * columns) < words
    return np.packbits(level, bitorder="little").view(np.dtype("<u8"))
