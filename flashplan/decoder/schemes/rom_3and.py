"""ROM behind three-input ANDs: an edge counts only where the threshold below it is passed as well."""

import numpy as np

from flashplan.decoder.lines import Codes, Words, edge_lines, or_of_addresses, rom_gates
from flashplan.decoder.netlist import Builder, Netlist


def decode(words: Words) -> Codes:
    """Word by word: OR of k over all k with thresholds k - 1 and k passed and k + 1 not; below the first all are passed."""
    below = np.concatenate(
        [np.ones((words.shape[0], 1), dtype=bool), words[:, :-1]], axis=1
    )
    return or_of_addresses(edge_lines(words) & below, np.arange(1, words.shape[1] + 1))


def build(bits: int) -> Netlist:
    """One AND of three for each line, of two at both ends."""
    gates = Builder(bits)
    t = gates.inputs
    lines = [gates.gate("and-not", t[0], t[1])]
    lines += [
        gates.gate("and-not", t[k - 1], t[k], t[k + 1]) for k in range(1, len(t) - 1)
    ]
    lines.append(gates.gate("and", t[-2], t[-1]))
    return gates.finish(rom_gates(gates, lines, np.arange(1, 2**bits)))
