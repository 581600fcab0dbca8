"""The thermometer words that a simulated array hands to the decoders."""

import numpy as np

from flashplan.array.result import DynamicResult
from flashplan.decoder import DecoderWords
from flashplan.metrics.sine import sine_weights
from flashplan.plan.model import Plan


def decoder_words(
    plan: Plan, dynamic: DynamicResult, word_error_rate: float | None
) -> DecoderWords:
    """Words of the dynamic run, and one word for each comparator that may be undecided, weighted by how often it is.

    An undecided comparator is the one whose threshold the input is nearest to: all below it are passed and none above,
    and a sine meets threshold k in a part w_k of all undecided conversions. word_error_rate: of the closed form, None
    where the cell does not tell, and the words then weigh nothing.
    """
    count = plan.comparators
    weights = sine_weights(plan.converter.bits)
    return DecoderWords(
        bubbly=dynamic.bubbly_words,
        clean_counts=dynamic.clean_counts,
        undecided=np.tri(count, count, -1, dtype=bool),
        undecided_at=np.arange(count),
        undecided_weight=(word_error_rate or 0.0) * weights / weights.sum(),
    )
