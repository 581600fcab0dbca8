"""Ladders that tests share."""

import numpy as np
from numpy.typing import NDArray

from flashplan.ladder.network import Network
from flashplan.ladder.reference import Reference, build_reference
from flashplan.ladder.states import network_states
from flashplan.plan import Plan, changed_plan
from tests.plans import starter_plan

# A layout with everything: two ringing ends, a folded string, a coarse one beside it.
RINGING = {
    "reference_resistance": 0.5,
    "lead_inductance": "0.5 nH",
    "decoupling_capacitance": "3 pF",
}
LAYOUTS: dict[str, dict[str, object]] = {
    "straight": {},
    "forced": {"forced_taps": [5, 8]},
    "softly forced": {"forced_taps": [8], "forced_resistance": 20},
    "folded": {"rows": 4, "turn_resistance": 3},
    "coarse": {"coarse_segments": 4, "coarse_ratio": 0.3},
    "differential": {"differential": True},
    "ringing": RINGING,
    "folded and ringing": {**RINGING, "rows": 4, "turn_resistance": 3},
    "a ringing pair": {**RINGING, "differential": True},
    "bare inductance": {"lead_inductance": "0.2 nH", "forced_taps": [8]},
}


def ladder_plan(bits: int, resistance: float, **ladder: object) -> Plan:
    """The starter plan with a ladder of its own and perfect but for what is given."""
    changes = {
        "converter.bits": bits,
        "goals.enob": bits - 0.6,
        "ladder.end_resistance": 0,
        "ladder.resistor_sigma": 0,
        "ladder.total_resistance": resistance,
    }
    return changed_plan(
        starter_plan(),
        {**changes, **{f"ladder.{key}": value for key, value in ladder.items()}},
    )


def reference_of(plan: Plan) -> Reference:
    return build_reference(plan, plan.datasheet, float(plan.ladder.total_resistance))


def dense_system(network: Network) -> tuple[NDArray, NDArray, NDArray]:
    """dx/dt = -S x, what a charge on the free nodes makes of x (s, f), and the free nodes' voltages from x (f, s)."""
    states = network_states(network)
    storage = states.storage.toarray()
    nodes = states.nodes.toarray()
    return (
        np.linalg.solve(storage, states.loss.toarray()),
        np.linalg.solve(storage, nodes.T),
        nodes,
    )
