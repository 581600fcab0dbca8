"""What an undecided comparator may do to the code: every gate that reads it may see either level."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder.evaluate import Program, evaluate, split_readers
from flashplan.decoder.words import DecoderWords

# Up to so many readers all their readings are tried; beyond, the two common ones and random ones.
EXACT_READERS = 10
_RANDOM_READINGS = 256

# Decisions expanded at once; bounds the memory.
_BLOCK = 2**24


@dataclass(frozen=True)
class UndecidedErrors:
    """Errors in LSB to the nearer of the two legal codes, over words by their weight and readings alike.

    wrong_rate, sparkle_rate: probability per conversion of any error, and of one over 2 LSB. exact: all readings tried
    for every word; else `max_lsb` is a lower bound and the rates and rms are estimates from random readings.
    """

    rms_lsb: float
    max_lsb: int
    wrong_rate: float
    sparkle_rate: float
    exact: bool


def undecided_errors(
    program: Program, words: DecoderWords, rng: np.random.Generator
) -> UndecidedErrors:
    """Follow each undecided comparator of `words` through the gates.

    The gates that read it give clean levels, whichever they took it for: an undecided level does not pass a gate.
    A word's legal codes are its number of ones with the undecided bit 0 and with it 1. rng draws the readings of
    comparators that more than EXACT_READERS gates read.
    """
    split, origin = split_readers(program)
    power = wrong = sparkle = 0.0
    largest = 0
    exact = True
    readers = np.bincount(origin, minlength=program.inputs)[words.undecided_at]
    for count in np.unique(readers):
        readings, common = _readings(int(count), rng)
        exact &= common == 0
        chosen = np.flatnonzero(readers == count)
        step = max(1, _BLOCK // (readings.shape[0] * origin.size))
        for start in range(0, chosen.size, step):
            part = chosen[start : start + step]
            errors = _errors(split, origin, readings, words, part)
            weight = words.undecided_weight[part]
            largest = max(largest, int(errors.max()))
            # The common readings are there for the maximum; they are far rarer than two in so many.
            drawn = errors[:, common:]
            power += float(weight @ np.mean(drawn**2.0, axis=1))
            wrong += float(weight @ np.mean(drawn > 0, axis=1))
            sparkle += float(weight @ np.mean(drawn > 2, axis=1))
    total = float(words.undecided_weight.sum())
    rms = float(np.sqrt(power / total)) if total > 0 else 0.0
    return UndecidedErrors(rms, largest, wrong, sparkle, exact)


def _errors(
    split: Program,
    origin: NDArray[np.int64],
    readings: NDArray[np.bool_],
    words: DecoderWords,
    part: NDArray[np.int64],
) -> NDArray[np.int64]:
    """Errors (words of this part, readings); the undecided comparators of all these words have equally many readers."""
    base = words.undecided[part].copy()
    at = words.undecided_at[part]
    base[np.arange(part.size), at] = False
    legal = base.sum(axis=1, dtype=np.int64)[:, None]
    lanes = np.repeat(base[:, None, origin], readings.shape[0], axis=1)
    first = np.searchsorted(origin, at)
    columns = first[:, None] + np.arange(readings.shape[1])
    lanes[
        np.arange(part.size)[:, None, None],
        np.arange(readings.shape[0])[:, None],
        columns[:, None, :],
    ] = readings
    codes = evaluate(split, lanes.reshape(-1, origin.size))
    above = codes.reshape(part.size, -1) - legal
    return np.minimum(np.abs(above), np.abs(above - 1))


def _readings(readers: int, rng: np.random.Generator) -> tuple[NDArray[np.bool_], int]:
    """Readings (r, readers), and how many of the first are not part of the average."""
    if readers <= EXACT_READERS:
        every = np.arange(2**readers)[:, None] >> np.arange(readers) & 1
        return every.astype(bool), 0
    drawn = rng.random((_RANDOM_READINGS, readers)) < 0.5
    common = np.repeat([[False], [True]], readers, axis=1)
    return np.concatenate([common, drawn]), 2
