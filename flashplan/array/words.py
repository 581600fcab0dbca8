"""The thermometer words that a simulated array hands to the decoders."""

import numpy as np

from flashplan.array.dynamic import undecided_word_rate
from flashplan.array.result import ArrayResult
from flashplan.decoder import DecoderWords
from flashplan.errors import InputError
from flashplan.metrics.sine import sine_weights
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan


def decoder_words(plan: Plan, cell: Datasheet, result: ArrayResult) -> DecoderWords:
    """Words of the dynamic run, and one word for each comparator that may be undecided, weighted by how often it is.

    An undecided comparator is the one whose threshold the input is nearest to: all below it are passed and none above,
    and a sine meets threshold k in a part w_k of all undecided conversions. Their rate is the closed form's, 0 where
    the cell does not tell. Raises InputError when there was no dynamic run.
    """
    if result.dynamic is None:
        raise InputError(
            f"decoders are compared on converted words, and the cell does not give {', '.join(result.left_out)}",
            plan.source,
        )
    count = plan.comparators
    rate = 0.0 if result.word_error_rate is None else undecided_word_rate(plan, cell)
    weights = sine_weights(plan.converter.bits)
    return DecoderWords(
        bubbly=result.dynamic.bubbly_words,
        clean_counts=result.dynamic.clean_counts,
        undecided=np.tri(count, count, -1, dtype=bool),
        undecided_at=np.arange(count),
        undecided_weight=rate * weights / weights.sum(),
    )
