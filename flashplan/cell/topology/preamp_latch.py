"""A resistively loaded preamplifier in front of a single-tail latch: quiet at its input, at the price of static power."""

from flashplan.cell.circuit import Branch, Circuit, Device
from flashplan.cell.topology.latch import latch_devices
from flashplan.cell.topology.sizes import Sizes, require_groups

NAME = "preamp-latch"
GROUPS = (
    "bias",
    "preamp",
    "tail",
    "input",
    "latch_n",
    "latch_p",
    "reset",
)


def preamp_latch(sizes: Sizes, load: float, resistance: float) -> Circuit:
    """Circuit with the groups of GROUPS; load in F on each output, resistance in ohm of each preamplifier load.

    The node "bias" is driven: its voltage sets the preamplifier's tail current.
    """
    require_groups(sizes, GROUPS, NAME)
    bias, pair = sizes["bias"], sizes["preamp"]
    core = {
        name: sizes[name] for name in ("tail", "input", "latch_n", "latch_p", "reset")
    }
    # The preamplifier inverts: the plus input lowers p_a, so that p_b drives the latch's positive side.
    return Circuit(
        free=("pair", "p_a", "p_b", "tail", "x_a", "x_b", "out", "out_b"),
        driven=("ground", "supply", "plus", "minus", "clock", "bias"),
        devices=(
            Device("bias", "n", "pair", "bias", "ground", bias.width, bias.length),
            Device("preamp_a", "n", "p_a", "plus", "pair", pair.width, pair.length),
            Device("preamp_b", "n", "p_b", "minus", "pair", pair.width, pair.length),
            *latch_devices(core, "p_b", "p_a"),
        ),
        outputs=("out", "out_b"),
        resistors=(
            Branch("p_a", "supply", resistance),
            Branch("p_b", "supply", resistance),
        ),
        capacitors=(
            Branch("out", "ground", load),
            Branch("out_b", "ground", load),
        ),
    )
