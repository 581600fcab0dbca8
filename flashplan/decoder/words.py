"""The thermometer words that schemes are compared on."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class DecoderWords:
    """Words of a dynamic run, M thresholds each, lowest first.

    bubbly: (n, M) words with a bubble. clean_counts: (M + 1,) number of clean words with that many ones.
    undecided: (u, M) words in which comparator undecided_at (u,) is undecided, its own bit meaningless;
    undecided_weight: (u,) part of all conversions that each stands for.
    """

    bubbly: NDArray[np.bool_]
    clean_counts: NDArray[np.int64]
    undecided: NDArray[np.bool_]
    undecided_at: NDArray[np.int64]
    undecided_weight: NDArray[np.float64]
