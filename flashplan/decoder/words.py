"""The thermometer words that decoders are compared on, with what each of them stands for."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class DecoderWords:
    """Words of an array's run; M comparators, lowest threshold first in every row.

    bubbly: (n_b, M) bool, every conversion whose word is not a clean thermometer code.
    clean_counts: (M + 1,) int, how many clean words had 0 .. M ones.
    undecided: (n_u, M) bool, words in which one comparator did not decide; its own bit may be either.
    undecided_at: (n_u,) int, column of that comparator.
    undecided_weight: (n_u,) float, probability per conversion that each such word stands for.
    """

    bubbly: NDArray[np.bool_]
    clean_counts: NDArray[np.int64]
    undecided: NDArray[np.bool_]
    undecided_at: NDArray[np.int64]
    undecided_weight: NDArray[np.float64]


def clean_words(comparators: int) -> NDArray[np.bool_]:
    """All clean thermometer codes of so many comparators: (M + 1, M) bool, row c with c ones.

    >>> clean_words(2).astype(int).tolist()
    [[0, 0], [1, 0], [1, 1]]
    """
    return np.arange(comparators) < np.arange(comparators + 1)[:, None]
