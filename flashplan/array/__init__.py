"""All comparators together: mismatch draws, conversion of a signal, undecided comparators."""

from flashplan.array.simulate import simulate_array
from flashplan.array.words import decoder_words

__all__ = ["decoder_words", "simulate_array"]
