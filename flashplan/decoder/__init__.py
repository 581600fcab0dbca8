"""Thermometer code to word: gate netlists, one module per scheme, cost, comparison."""

from flashplan.decoder.decode import decode
from flashplan.decoder.words import DecoderWords

__all__ = ["DecoderWords", "decode"]
