"""majority-rom: each decision is outvoted by its two neighbours before a read-only memory."""

from itertools import pairwise

import numpy as np

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes import rom
from flashplan.decoder.schemes.lines import Codes, Words, above, below, wired_or


def decode(words: Words) -> Codes:
    """The binary read-only memory behind the majority of each decision and its two neighbours."""
    low, high = below(words), above(words)
    return rom.decode((low & words) | (low & high) | (words & high))


def build(bits: int) -> Netlist:
    """A majority gate per decision (an adder's carry; OR and AND at the ends), then lines and wired ORs."""
    b = Builder(bits)
    voted = [b.gate("or", b.t(1), b.t(2))]
    voted += [
        b.gate("carry", b.t(k - 1), b.t(k), b.t(k + 1)) for k in range(2, b.lines)
    ]
    voted.append(b.gate("and", b.t(b.lines - 1), b.t(b.lines)))
    lines = [
        b.gate("and", net, b.gate("not", higher)) for net, higher in pairwise(voted)
    ]
    return b.finish(
        "majority-rom", wired_or(b, [*lines, voted[-1]], np.arange(1, b.lines + 1))
    )
