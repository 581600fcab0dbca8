"""All schemes on the same words: cost, and the errors that bubbles and undecided comparators make."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from flashplan.decoder import netlist as gates
from flashplan.decoder.netlist import Netlist
from flashplan.decoder.schemes import SCHEMES
from flashplan.decoder.words import DecoderWords
from flashplan.plan.model import Plan

# With more gates than this reading one comparator, the combinations are sampled with all-low and all-high among them.
_EXACT_READERS = 10
_SAMPLED = 1024


@dataclass(frozen=True)
class SchemeResult:
    """One scheme. Errors in LSB against the number of thresholds passed; rates per conversion.

    undecided_*: over all levels that the gates reading an undecided comparator may see, against the nearer of the two
    legal codes; None where the cell does not tell how often that happens.
    """

    name: str
    gates: int
    depth: int
    transistors: int
    rms_error_lsb: float
    max_error_lsb: int
    wrong_word_rate: float
    undecided_rms_error_lsb: float
    undecided_max_error_lsb: int

    def to_dict(self) -> dict[str, Any]:
        """One entry of the JSON of the verb `decoders`."""
        return {name: getattr(self, name) for name in self.__dataclass_fields__}


@dataclass(frozen=True)
class DecoderTable:
    """All schemes on the same words; note: what the words cannot tell."""

    conversions: int
    bubbly_words: int
    schemes: tuple[SchemeResult, ...]
    note: str

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `decoders`."""
        return {
            "conversions": self.conversions,
            "bubbly_words": self.bubbly_words,
            "note": self.note,
            "schemes": [scheme.to_dict() for scheme in self.schemes],
        }


def compare_schemes(plan: Plan, words: DecoderWords) -> DecoderTable:
    """Compare every scheme.

    Clean words decode the same in all, so that only those with a bubble are looked at; of undecided comparators every
    combination of levels that their readers may see, or a thousand of them where more than ten gates read one.
    """
    total = int(words.clean_counts.sum()) + words.bubbly.shape[0]
    note = (
        ""
        if words.bubbly.shape[0]
        else "no word of this array has a bubble: the words cannot tell the schemes apart"
    )
    found = tuple(_compare(name, plan.converter.bits, words, total) for name in SCHEMES)
    return DecoderTable(total, words.bubbly.shape[0], found, note)


def _compare(name: str, bits: int, words: DecoderWords, total: int) -> SchemeResult:
    scheme = SCHEMES[name]
    netlist: Netlist = scheme.build(bits)
    error = np.abs(scheme.decode(words.bubbly) - np.count_nonzero(words.bubbly, axis=1))
    rms, largest = _undecided_errors(netlist, words)
    return SchemeResult(
        name=name,
        gates=sum(gates.gate_counts(netlist).values()),
        depth=gates.depth(netlist),
        transistors=gates.transistors(netlist),
        rms_error_lsb=float(np.sqrt((error.astype(float) ** 2).sum() / total)),
        max_error_lsb=int(error.max(initial=0)),
        wrong_word_rate=float(np.count_nonzero(error) / total),
        undecided_rms_error_lsb=rms,
        undecided_max_error_lsb=largest,
    )


def _undecided_errors(netlist: Netlist, words: DecoderWords) -> tuple[float, int]:
    square, largest = np.zeros(words.undecided_at.size), 0
    for place, (word, index) in enumerate(
        zip(words.undecided, words.undecided_at, strict=True)
    ):
        levels = _levels(len(gates.readers(netlist, int(index))))
        codes = gates.evaluate_readings(netlist, word, int(index), levels)
        ones = int(np.count_nonzero(np.delete(word, index)))
        error = np.minimum(np.abs(codes - ones), np.abs(codes - ones - 1))
        square[place] = np.mean(error.astype(float) ** 2)
        largest = max(largest, int(error.max()))
    weight = words.undecided_weight
    mean = np.average(square, weights=weight if weight.sum() > 0 else None)
    return float(np.sqrt(mean)), largest


def _levels(readers: int) -> NDArray[np.bool_]:
    if readers <= _EXACT_READERS:
        return (np.arange(2**readers)[:, None] >> np.arange(readers) & 1).astype(bool)
    drawn = np.random.default_rng(readers).random((_SAMPLED, readers)) < 0.5
    drawn[0], drawn[1] = False, True
    return drawn
