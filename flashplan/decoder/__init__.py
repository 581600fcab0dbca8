"""Thermometer code to word: gate netlists, one module per scheme, cost, comparison."""

from difflib import get_close_matches

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.decoder.compare import DecoderTable, compare_schemes
from flashplan.decoder.schemes import SCHEMES
from flashplan.decoder.words import DecoderWords
from flashplan.errors import InputError

__all__ = ["SCHEMES", "DecoderTable", "DecoderWords", "compare_schemes", "decode"]


def decode(scheme: str, thermometer: ArrayLike) -> NDArray[np.int64]:
    """Decode thermometer words (n, 2**bits - 1), lowest threshold first, to codes (n,).

    Raises InputError for an unknown scheme or a width that is not 2**bits - 1.

    >>> decode("ones-counter", [[True, True, False]])
    array([2])
    """
    if scheme not in SCHEMES:
        close = get_close_matches(scheme, SCHEMES, n=1)
        known = ", ".join(SCHEMES)
        raise InputError(
            f"unknown scheme {scheme!r}"
            + (f"; the nearest is {close[0]!r}" if close else "")
            + f"; known: {known}"
        )
    words = np.asarray(thermometer, dtype=bool)
    if words.ndim != 2 or words.shape[1] < 3 or (words.shape[1] + 1) & words.shape[1]:
        raise InputError(
            f"thermometer words have 2**bits - 1 decisions each, found an array of shape {words.shape}"
        )
    return np.asarray(SCHEMES[scheme].decode(words))
