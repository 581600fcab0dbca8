"""The double-tail clocked latch: an input stage that discharges two nodes, a second stage that decides which was first."""

from flashplan.cell.circuit import Branch, Circuit, Device
from flashplan.cell.topology.sizes import Sizes, require_groups

NAME = "double-tail"
GROUPS = (
    "tail",
    "input",
    "reset",
    "second_tail",
    "transfer",
    "latch_n",
    "latch_p",
)


def double_tail(sizes: Sizes, load: float) -> Circuit:
    """Circuit with the groups of GROUPS; load in F on each output.

    The first stage's nodes x_a, x_b start at the supply and fall at a rate set by their input; they hold the second
    stage's outputs low through the transfer devices until they have fallen, x_a for out, x_b for out_b.
    Source of the circuit: D. Schinkel et al., ISSCC 2007 (memory).
    """
    require_groups(sizes, GROUPS, NAME)

    def device(
        name: str, kind: str, drain: str, gate: str, source: str, group: str
    ) -> Device:
        size = sizes[group]
        return Device(name, kind, drain, gate, source, size.width, size.length)

    return Circuit(
        free=("tail", "x_a", "x_b", "top", "out", "out_b"),
        driven=("ground", "supply", "plus", "minus", "clock", "clock_b"),
        devices=(
            device("tail", "n", "tail", "clock", "ground", "tail"),
            device("input_a", "n", "x_a", "plus", "tail", "input"),
            device("input_b", "n", "x_b", "minus", "tail", "input"),
            device("reset_a", "p", "x_a", "clock", "supply", "reset"),
            device("reset_b", "p", "x_b", "clock", "supply", "reset"),
            device("second_tail", "p", "top", "clock_b", "supply", "second_tail"),
            device("latch_p_a", "p", "out", "out_b", "top", "latch_p"),
            device("latch_p_b", "p", "out_b", "out", "top", "latch_p"),
            device("latch_n_a", "n", "out", "out_b", "ground", "latch_n"),
            device("latch_n_b", "n", "out_b", "out", "ground", "latch_n"),
            device("transfer_a", "n", "out", "x_a", "ground", "transfer"),
            device("transfer_b", "n", "out_b", "x_b", "ground", "transfer"),
        ),
        outputs=("out", "out_b"),
        capacitors=(
            Branch("out", "ground", load),
            Branch("out_b", "ground", load),
        ),
    )
