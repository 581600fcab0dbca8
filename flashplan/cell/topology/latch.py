"""The single-tail latch core: one clocked tail, an input pair, cross-coupled inverters on top."""

from flashplan.cell.circuit import Device
from flashplan.cell.topology.sizes import Sizes

GROUPS = ("tail", "input", "latch_n", "latch_p", "reset")


def latch_devices(sizes: Sizes, positive: str, negative: str) -> tuple[Device, ...]:
    """Eleven devices between the nodes tail, x_a, x_b, out, out_b; `positive` and `negative` name the input nodes.

    The side whose input is higher falls first, so that "out" (above the negative input) goes high for a positive input.
    Source of the circuit: T. Kobayashi et al., IEEE JSSC 28(4), 1993 (memory), with resets on all inner nodes.
    """

    def device(
        name: str, kind: str, drain: str, gate: str, source: str, group: str
    ) -> Device:
        size = sizes[group]
        return Device(name, kind, drain, gate, source, size.width, size.length)

    return (
        device("tail", "n", "tail", "clock", "ground", "tail"),
        device("input_a", "n", "x_a", positive, "tail", "input"),
        device("input_b", "n", "x_b", negative, "tail", "input"),
        device("latch_n_a", "n", "out_b", "out", "x_a", "latch_n"),
        device("latch_n_b", "n", "out", "out_b", "x_b", "latch_n"),
        device("latch_p_a", "p", "out_b", "out", "supply", "latch_p"),
        device("latch_p_b", "p", "out", "out_b", "supply", "latch_p"),
        device("reset_out_a", "p", "out_b", "clock", "supply", "reset"),
        device("reset_out_b", "p", "out", "clock", "supply", "reset"),
        device("reset_x_a", "p", "x_a", "clock", "supply", "reset"),
        device("reset_x_b", "p", "x_b", "clock", "supply", "reset"),
    )
