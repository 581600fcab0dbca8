"""fat-tree: the one-hot lines of the plain read-only memory through shared balanced trees of two-input OR gates."""

from flashplan.decoder.netlist import Builder, Netlist
from flashplan.decoder.schemes import rom
from flashplan.decoder.schemes.lines import line_gates

# The same word by word; only the gates differ.
decode = rom.decode


def build(bits: int) -> Netlist:
    """Two-input OR gates only, bits - 1 levels of them behind the lines.

    Level j holds the OR of each aligned block of 2**j lines; bit j is a tree over the odd blocks of level j.
    Source: D. Lee, J. Yoo, K. Choi, J. Ghaznavi, "Fat tree encoder design for ultra-high speed flash A/D converters",
    Midwest Symposium on Circuits and Systems, 2002 (memory).
    """
    b = Builder(bits)
    # Line 0 drives no bit, so block 0 of every level is never asked for.
    blocks = dict(enumerate(line_gates(b), start=1))
    word = []
    for _ in range(bits):
        odd = [net for index, net in blocks.items() if index % 2]
        word.append(b.tree("or", odd))
        blocks = {
            index // 2: b.gate("or", net, blocks[index + 1])
            for index, net in blocks.items()
            if index % 2 == 0
        }
    return b.finish("fat-tree", word)
