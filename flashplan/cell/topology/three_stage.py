"""The continuous-time three-stage comparator: preamplifier, cross-coupled decision stage, self-biased output stage."""

from flashplan.cell.circuit import Branch, Circuit, Device
from flashplan.cell.topology.sizes import Sizes, require_groups

NAME = "three-stage"
OUTPUT_GROUPS = (
    "out_n",
    "out_p",
    "out_tail_n",
    "out_tail_p",
    "inverter_n",
    "inverter_p",
)
GROUPS = (
    "bias",
    "input",
    "diode",
    "mirror",
    "decision",
    "cross",
    "shift",
    *OUTPUT_GROUPS,
)


def three_stage(sizes: Sizes, load: float, shifted: bool = True) -> Circuit:
    """Circuit with the groups of GROUPS; load in F on the output; the node "bias" is driven and sets the tail current.

    The pair's currents, mirrored by mirror/diode, feed the decision stage, whose ratio r = cross/decision sets the
    hysteresis: none up to r = 1, about 2 (I/gm) (r - 1)/(r + 1) beyond. The diode "shift" lifts the decision stage so
    that its outputs lie in the linear input range of the output stage; without `shifted` its sources are at ground.
    """
    require_groups(sizes, GROUPS, NAME)

    def device(
        name: str, kind: str, drain: str, gate: str, source: str, group: str
    ) -> Device:
        size = sizes[group]
        return Device(name, kind, drain, gate, source, size.width, size.length)

    foot = "foot" if shifted else "ground"
    lift = (device("shift", "n", "foot", "foot", "ground", "shift"),) if shifted else ()
    return Circuit(
        free=(
            "pair",
            "m_a",
            "m_b",
            "d_a",
            "d_b",
            *(("foot",) if shifted else ()),
            "self",
            "y",
            "high",
            "low",
            "out",
        ),
        driven=("ground", "supply", "plus", "minus", "bias"),
        devices=(
            device("bias", "n", "pair", "bias", "ground", "bias"),
            device("input_a", "n", "m_a", "plus", "pair", "input"),
            device("input_b", "n", "m_b", "minus", "pair", "input"),
            device("diode_a", "p", "m_a", "m_a", "supply", "diode"),
            device("diode_b", "p", "m_b", "m_b", "supply", "diode"),
            device("mirror_a", "p", "d_a", "m_a", "supply", "mirror"),
            device("mirror_b", "p", "d_b", "m_b", "supply", "mirror"),
            device("decision_a", "n", "d_a", "d_a", foot, "decision"),
            device("decision_b", "n", "d_b", "d_b", foot, "decision"),
            device("cross_a", "n", "d_a", "d_b", foot, "cross"),
            device("cross_b", "n", "d_b", "d_a", foot, "cross"),
            *lift,
            *_output_devices(sizes),
        ),
        outputs=("out", ""),
        capacitors=(Branch("out", "ground", load),),
    )


def output_stage(sizes: Sizes, load: float) -> Circuit:
    """The output stage alone, its inputs d_a and d_b driven: for its linear input range."""
    return Circuit(
        free=("self", "y", "high", "low", "out"),
        driven=("ground", "supply", "d_a", "d_b"),
        devices=_output_devices(sizes),
        outputs=("out", ""),
        capacitors=(Branch("out", "ground", load),),
    )


def _output_devices(sizes: Sizes) -> tuple[Device, ...]:
    """Two inverters between a p-channel and an n-channel tail, both set by the first one's output; then an inverter.

    Source of the self-biased stage: M. Bazes, IEEE J. Solid-State Circuits 26(2), 1991 (memory).
    """

    def device(
        name: str, kind: str, drain: str, gate: str, source: str, group: str
    ) -> Device:
        size = sizes[group]
        return Device(name, kind, drain, gate, source, size.width, size.length)

    return (
        device("out_p_b", "p", "self", "d_b", "high", "out_p"),
        device("out_n_b", "n", "self", "d_b", "low", "out_n"),
        device("out_p_a", "p", "y", "d_a", "high", "out_p"),
        device("out_n_a", "n", "y", "d_a", "low", "out_n"),
        device("out_tail_p", "p", "high", "self", "supply", "out_tail_p"),
        device("out_tail_n", "n", "low", "self", "ground", "out_tail_n"),
        device("inverter_p", "p", "out", "y", "supply", "inverter_p"),
        device("inverter_n", "n", "out", "y", "ground", "inverter_n"),
    )
