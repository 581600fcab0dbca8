"""Thermometer words to codes, by the name of a scheme."""

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder.schemes import scheme
from flashplan.errors import InputError

# Decisions decoded at once; bounds the memory whatever the number of words.
_BLOCK = 2**22


def decode(name: str, thermometer: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Codes (n,) of thermometer words (n, 2**bits - 1), bool or 0 and 1, lowest threshold first.

    Word by word as the scheme defines it; its gates give the same. Raises InputError for an unknown scheme or a width
    that is not 2**bits - 1 for 2 to 12 bits.

    >>> word = np.array([[1, 1, 0, 1, 0, 0, 0]], dtype=bool)   # three ones, one of them astray
    >>> [int(decode(name, word)[0]) for name in ("ones-counter", "rom", "majority-rom")]
    [3, 6, 3]
    """
    chosen = scheme(name)
    words = np.asarray(thermometer)
    width = words.shape[1] if words.ndim == 2 else 0
    if width not in {2**bits - 1 for bits in range(2, 13)}:
        raise InputError(
            f"thermometer words of shape {words.shape}; accepted is (n, 2**bits - 1), 2 to 12 bits",
            "thermometer",
        )
    if not (words.dtype == bool or np.isin(words, (0, 1)).all()):
        raise InputError("a decision is neither 0 nor 1", "thermometer")
    codes = np.empty(words.shape[0], dtype=np.int64)
    step = max(1, _BLOCK // width)
    for start in range(0, words.shape[0], step):
        part = words[start : start + step].astype(bool, copy=False)
        codes[start : start + step] = chosen.decode(part)
    return codes
