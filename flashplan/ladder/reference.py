"""The plan's reference ladder as a network: references, leads, strings, taps, and what hangs on each tap."""

from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_array

from flashplan.ladder.network import (
    GROUND,
    Network,
    Part,
    build_network,
    with_resistances,
)
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.ladder import Ladder, check_ladder
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]

INPUT, INVERSE = "input", "inverse input"
_UNIT, _COARSE = "ladder unit", "coarse resistor"


@dataclass(frozen=True)
class Reference:
    """A network and where its M thresholds are read: threshold = taps @ v + held + offset, in V.

    taps: (M, f) on the free nodes' voltages v; held: (M,) from the held ones, offset included.
    split: part of a decision's differential charge that goes into each string. drive: phasors of the input nodes for a
    differential input of 1 V. A charge of 1 C at threshold k is split * taps[k] on the nodes.
    string: resistors that total_resistance, in ohm, scales, among all of the network.
    """

    network: Network
    taps: csc_array
    held: Floats
    split: float
    drive: dict[str, complex]
    string: NDArray[np.bool_]
    total_resistance: float


def build_reference(plan: Plan, cell: Datasheet, total_resistance: float) -> Reference:
    """Network of the plan's ladder with what the cell hangs on it.

    Each tap has the plan's capacitance to ground and the cell's coupling capacitance to the input, none where the cell
    does not give it. total_resistance: of the units of each string, in ohm. Raises InputError for what does not fit.

    Two strings: threshold k is the one's tap k against the other's, which is driven upside down, plus half the full
    scale. Each spans half the full scale, sees half the input and takes half of a decision's differential charge.
    """
    ladder, bits = plan.ladder, plan.converter.bits
    check_ladder(ladder, bits, plan.source)
    units = unit_resistances(ladder, bits, total_resistance)
    span = plan.converter.full_scale
    if not ladder.differential:
        parts = _string(ladder, cell, units, "", (0.0, span), INPUT)
        network = build_network(
            [*parts, Part("voltage", INPUT, GROUND, 0.0, "signal input")]
        )
        taps, held = _readout(network, plan.comparators, "")
        return Reference(
            network,
            taps,
            held,
            1.0,
            {INPUT: 1.0},
            _of_string(parts),
            total_resistance,
        )
    parts = [
        *_string(ladder, cell, units, "first ", (0.0, span / 2), INPUT),
        *_string(ladder, cell, units, "second ", (span / 2, 0.0), INVERSE),
        Part("voltage", INPUT, GROUND, 0.0, "signal input"),
        Part("voltage", INVERSE, GROUND, 0.0, "inverse signal input"),
    ]
    network = build_network(parts)
    first, first_held = _readout(network, plan.comparators, "first ")
    second, second_held = _readout(network, plan.comparators, "second ")
    return Reference(
        network,
        csc_array(first - second),
        first_held - second_held + span / 2,
        0.5,
        {INPUT: 0.5, INVERSE: -0.5},
        _of_string(parts),
        total_resistance,
    )


def rescaled(reference: Reference, total_resistance: float) -> Reference:
    """The same reference with another resistance of its strings, in ohm; all else stays."""
    ratio = total_resistance / reference.total_resistance
    value = reference.network.resistors.value
    network = with_resistances(
        reference.network, np.where(reference.string, ratio * value, value)
    )
    return replace(reference, network=network, total_resistance=total_resistance)


def _of_string(parts: list[Part]) -> NDArray[np.bool_]:
    return np.array(
        [
            _UNIT in part.label or _COARSE in part.label
            for part in parts
            if part.kind == "resistor"
        ]
    )


def unit_resistances(ladder: Ladder, bits: int, total_resistance: float) -> Floats:
    """Resistance of each unit of a string in ohm, (2**bits,), from the low end up; they sum to total_resistance.

    At place x along its row, 0 to 1: 1 + linear (x - 1/2) + quadratic (2 x - 1)^2, each second row running back.

    >>> unit_resistances(Ladder(gradient_linear=0.2), 2, 4.0).round(3).tolist()
    [0.925, 0.975, 1.025, 1.075]
    """
    count = 2**bits
    along = (np.arange(count) + 0.5) / count * ladder.rows
    row = np.floor(along)
    place = np.where(row % 2 == 0, along - row, row + 1 - along)
    shape = (
        1.0
        + ladder.gradient_linear * (place - 0.5)
        + ladder.gradient_quadratic * (2 * place - 1) ** 2
    )
    return total_resistance * shape / shape.sum()


def turns(ladder: Ladder, bits: int) -> list[int]:
    """Units behind which the string turns, from 1."""
    return [round(row * 2**bits / ladder.rows) for row in range(1, ladder.rows)]


def _readout(network: Network, count: int, string: str) -> tuple[csc_array, Floats]:
    place = {name: index for index, name in enumerate(network.names)}
    names = [f"{string}tap {k}" for k in range(1, count + 1)]
    free = [(k, place[name]) for k, name in enumerate(names) if name in place]
    rows, columns = np.array(free, dtype=int).reshape(-1, 2).T
    taps = csc_array(
        (np.ones(rows.size), (rows, columns)), shape=(count, len(network.names))
    )
    return taps, np.array([network.held.get(name, 0.0) for name in names])


def _string(
    ladder: Ladder,
    cell: Datasheet,
    units: Floats,
    string: str,
    ends: tuple[float, float],
    signal: str,
) -> list[Part]:
    """Parts of one string between two references, in the order of its nodes, so that a plain chain stays one."""
    count = units.size
    low, low_lead = _lead(ladder, string, "low", ends[0])
    high, high_lead = _lead(ladder, string, "high", ends[1])
    nodes = [low, *(f"{string}tap {k}" for k in range(1, count)), high]
    turn_behind = set(turns(ladder, count.bit_length() - 1))
    parts = list(low_lead)
    for k, (first, second) in enumerate(pairwise(nodes), 1):
        start = first
        if k - 1 in turn_behind and ladder.turn_resistance > 0:
            start = f"{string}turn {k - 1}"
            label = f"{string}turn {k - 1}"
            parts.append(Part("resistor", first, start, ladder.turn_resistance, label))
        label = f"{string}{_UNIT} {k}"
        parts.append(
            Part("resistor", start, second, units[k - 1], label, ladder.resistor_sigma)
        )
    parts += high_lead
    if ladder.coarse_segments:
        assert ladder.coarse_ratio is not None
        step = count // ladder.coarse_segments
        each = ladder.coarse_ratio * float(units.sum()) / ladder.coarse_segments
        for index, (first, second) in enumerate(pairwise(nodes[::step]), 1):
            label = f"{string}{_COARSE} {index}"
            parts.append(
                Part("resistor", first, second, each, label, ladder.coarse_sigma)
            )
    for k, node in enumerate(nodes[1:-1], 1):
        ideal = ends[0] + (ends[1] - ends[0]) * k / count
        parts += _at_tap(ladder, cell, node, ideal, k in ladder.forced_taps, signal)
    return parts


def _lead(
    ladder: Ladder, string: str, side: str, voltage: float
) -> tuple[str, list[Part]]:
    """The string's end node, and the parts between it and its reference."""
    source, end = f"{string}{side} reference", f"{string}{side} end"
    parts = [Part("voltage", source, GROUND, voltage, source)]
    node = source
    for kind, value, what in (
        ("resistor", ladder.reference_resistance, "reference resistance"),
        ("resistor", ladder.end_resistance, "lead resistance"),
        ("inductor", ladder.lead_inductance, "lead inductance"),
    ):
        if value > 0:
            label = f"{string}{side} {what}"
            parts.append(Part(kind, node, f"{label} end", value, label))  # type: ignore[arg-type]
            node = f"{label} end"
    if node == source:
        return source, parts
    # The last part ends at the string itself.
    parts[-1] = parts[-1]._replace(second=end)
    if ladder.decoupling_capacitance > 0:
        label = f"{string}{side} decoupling"
        parts.append(
            Part("capacitor", end, GROUND, ladder.decoupling_capacitance, label)
        )
    return end, parts


def _at_tap(
    ladder: Ladder,
    cell: Datasheet,
    node: str,
    ideal: float,
    forced: bool,
    signal: str,
) -> list[Part]:
    parts = []
    if forced and ladder.forced_resistance > 0:
        parts = [
            Part("voltage", f"{node} source", GROUND, ideal, f"force of {node}"),
            Part(
                "resistor",
                f"{node} source",
                node,
                ladder.forced_resistance,
                f"forcing resistance of {node}",
            ),
        ]
    elif forced:
        return [Part("voltage", node, GROUND, ideal, f"force of {node}")]
    parts.append(
        Part(
            "capacitor", node, GROUND, ladder.tap_capacitance, f"capacitance of {node}"
        )
    )
    if cell.coupling_capacitance:
        parts.append(
            Part(
                "capacitor",
                node,
                signal,
                cell.coupling_capacitance,
                f"coupling to {node}",
            )
        )
    if ladder.bias_current:
        parts.append(
            Part("current", node, GROUND, ladder.bias_current, f"bias of {node}")
        )
    return parts
