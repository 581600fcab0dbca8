"""sorted-rom: a few stages of a sorting network move stray decisions towards the edge, then a read-only memory."""

from itertools import pairwise

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes import rom
from flashplan.decoder.schemes.lines import Codes, Words, wired_or

# Enough that any decision may move by four thresholds; a full sort would need as many stages as there are thresholds.
STAGES = 4


def decode(words: Words) -> Codes:
    """Odd-even transposition: each stage sorts neighbouring pairs, ones to the lower threshold; then the binary rom.

    Source: D. E. Knuth, The Art of Computer Programming 3, section 5.3.4, odd-even transposition sort (memory).
    """
    nets = words.copy()
    for stage in range(STAGES):
        first = stage % 2
        low = nets[:, first:-1:2]
        high = nets[:, first + 1 :: 2]
        low[...], high[...] = low | high, low & high
    return rom.decode(nets)


def build(bits: int) -> Netlist:
    """An OR and an AND gate per pair and stage, then lines and wired ORs."""
    b = Builder(bits)
    nets = [b.t(k) for k in range(1, b.lines + 1)]
    for stage in range(STAGES):
        for low in range(stage % 2, b.lines - 1, 2):
            pair = nets[low], nets[low + 1]
            nets[low], nets[low + 1] = b.gate("or", *pair), b.gate("and", *pair)
    lines = [
        b.gate("and", net, b.gate("not", higher)) for net, higher in pairwise(nets)
    ]
    return b.finish(
        "sorted-rom", wired_or(b, [*lines, nets[-1]], np.arange(1, b.lines + 1))
    )
