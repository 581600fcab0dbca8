"""The single-tail clocked latch."""

from flashplan.cell.circuit import Branch, Circuit
from flashplan.cell.topology.latch import GROUPS, latch_devices
from flashplan.cell.topology.sizes import Sizes, require_groups

NAME = "single-tail"


def single_tail(sizes: Sizes, load: float) -> Circuit:
    """Circuit with groups tail, input, latch_n, latch_p, reset; load in F on each output."""
    require_groups(sizes, GROUPS, NAME)
    return Circuit(
        free=("tail", "x_a", "x_b", "out", "out_b"),
        driven=("ground", "supply", "plus", "minus", "clock"),
        devices=latch_devices(sizes, "plus", "minus"),
        outputs=("out", "out_b"),
        capacitors=(
            Branch("out", "ground", load),
            Branch("out_b", "ground", load),
        ),
    )
