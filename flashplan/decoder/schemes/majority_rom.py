"""ROM behind majority gates: each decision is outvoted by its two neighbours."""

import numpy as np

from flashplan.decoder.lines import Codes, Words, edge_gates, rom_gates
from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes import rom


def decode(words: Words) -> Codes:
    """Word by word: each decision becomes the majority of itself and its neighbours, 1 below the first, 0 above the last."""
    rows = words.shape[0]
    below = np.concatenate([np.ones((rows, 1), dtype=bool), words[:, :-1]], axis=1)
    above = np.concatenate([words[:, 1:], np.zeros((rows, 1), dtype=bool)], axis=1)
    return rom.decode((below & words) | (above & (below | words)))


def build(bits: int) -> Netlist:
    """A majority gate for each decision, an OR and an AND at the ends, then a ROM."""
    gates = Builder(bits)
    t = gates.inputs
    voted = [gates.gate("or", t[0], t[1])]
    voted += [
        gates.gate("majority", t[k - 1], t[k], t[k + 1]) for k in range(1, len(t) - 1)
    ]
    voted.append(gates.gate("and", t[-2], t[-1]))
    return gates.finish(
        rom_gates(gates, edge_gates(gates, voted), np.arange(1, 2**bits))
    )
