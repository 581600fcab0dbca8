"""Static behaviour of a continuous cell: transfer, gain, offset, trip points, and the output stage's linear range."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.circuit import Network
from flashplan.cell.device import DeviceParameters
from flashplan.cell.steady import steady_state

Floats = NDArray[np.float64]

_FIRST_STEP = 1e-12  # s
_LINEAR_PART = 0.5  # of the largest gain, down to which a stage counts as linear


@dataclass(frozen=True)
class StaticSetup:
    """A continuous cell's network, the voltages of its reference input and of its bias node."""

    network: Network
    common_mode: float
    bias: float


@dataclass(frozen=True)
class Transfer:
    """Output over input: difference V and output V (points,); gain at its steepest; offset V where it crosses half the
    supply; full_swing V of input that the steepest gain takes to move the output over the supply."""

    difference: Floats
    output: Floats
    gain: float
    offset: float
    full_swing: float
    failed: int

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON types."""
        return {
            "difference": self.difference.tolist(),
            "output": self.output.tolist(),
            "gain": self.gain,
            "offset": self.offset,
            "full_swing": self.full_swing,
            "failed": self.failed,
        }


@dataclass(frozen=True)
class TripPoints:
    """Input at which the output turns, upward and downward, (instances,) V; hysteresis is their distance."""

    up: Floats
    down: Floats
    failed: NDArray[np.bool_]

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON types."""
        return {
            "up": self.up.tolist(),
            "down": self.down.tolist(),
            "failed": int(self.failed.sum()),
        }


def driven_levels(setup: StaticSetup, difference: Floats) -> Floats:
    """Voltages of the driven nodes with the inputs `difference` V apart: (driven, instances)."""
    fixed = {"ground": 0.0, "supply": setup.network.supply, "bias": setup.bias}
    rows = []
    for name in setup.network.circuit.driven:
        if name in fixed:
            rows.append(np.full(difference.size, fixed[name]))
        else:
            moved = difference if name == "plus" else np.zeros(difference.size)
            rows.append(setup.common_mode + moved)
    return np.stack(rows)


def rest_state(
    setup: StaticSetup,
    parameters: DeviceParameters,
    difference: Floats,
    start: Floats | None = None,
) -> tuple[Floats, NDArray[np.bool_]]:
    """Free nodes at rest for each input difference in V, from `start` or from half the supply everywhere."""
    if start is None:
        free = len(setup.network.circuit.free)
        start = np.full((free, difference.size), 0.5 * setup.network.supply)
    return steady_state(
        setup.network,
        parameters,
        driven_levels(setup, difference),
        start,
        _FIRST_STEP,
    )


def measure_transfer(setup: StaticSetup, reach: float, points: int = 401) -> Transfer:
    """Static transfer between -reach and +reach V of input, all points at once; of a cell without hysteresis."""
    difference = np.linspace(-reach, reach, points)
    state, failed = rest_state(setup, setup.network.parameters, difference)
    output = state[_out(setup.network)]
    good = ~failed
    slope = np.gradient(output[good], difference[good])
    gain = float(slope.max())
    half = setup.network.supply / 2.0
    beyond = np.flatnonzero(output[good] >= half)
    if not beyond.size or beyond[0] == 0:
        raise ValueError("the output does not cross half the supply within the reach")
    k = int(beyond[0])
    x, y = difference[good], output[good]
    offset = float(np.interp(half, y[k - 1 : k + 1], x[k - 1 : k + 1]))
    return Transfer(
        difference, output, gain, offset, setup.network.supply / gain, int(failed.sum())
    )


def measure_trip_points(
    setup: StaticSetup,
    parameters: DeviceParameters,
    instances: int,
    reach: float,
    resolution: float,
) -> TripPoints:
    """Trip points of all instances by bisection between -reach and +reach V, upward from low and downward from high.

    Every trial starts from the state at rest at the far end, as a sweep would come from there, so that no delay enters.
    """
    row, half = _out(setup.network), setup.network.supply / 2.0
    trips = []
    failed = np.zeros(instances, dtype=bool)
    for sign in (-1.0, 1.0):
        origin = np.full(instances, sign * reach)
        rested, lost = rest_state(setup, parameters, origin)
        failed |= lost
        stays, turns = origin, -origin
        while float(np.abs(turns - stays).max()) > resolution:
            middle = 0.5 * (stays + turns)
            state, lost = rest_state(setup, parameters, middle, rested)
            failed |= lost
            turned = (state[row] > half) == (sign < 0)
            stays, turns = (
                np.where(turned, stays, middle),
                np.where(turned, middle, turns),
            )
        trips.append(0.5 * (stays + turns))
    return TripPoints(trips[0], trips[1], failed)


@dataclass(frozen=True)
class LinearRange:
    """Input levels in V between which the output stage keeps half its largest gain; level: where the decision stage's
    outputs lie at balance; met: whether that is inside."""

    low: float
    high: float
    level: float
    largest_gain: float
    met: bool

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON types."""
        return {
            "low": self.low,
            "high": self.high,
            "level": self.level,
            "largest_gain": self.largest_gain,
            "met": self.met,
        }


def measure_linear_range(stage: Network, level: float, points: int = 51) -> LinearRange:
    """Linear input range of the output stage alone, by its differential gain over the level of both its inputs.

    stage: the network of `output_stage`; level: V at which its inputs rest in the cell. The gain is taken from its
    inputs to the node "y", before the inverter, which only sharpens.
    """
    levels = np.linspace(0.0, stage.supply, points)
    step = 1e-4
    rows = {
        "ground": np.zeros(points),
        "supply": np.full(points, stage.supply),
        "d_a": levels,
        "d_b": levels,
    }
    y = stage.circuit.free.index("y")
    outputs = []
    for sign in (1.0, -1.0):
        rows["d_a"], rows["d_b"] = levels + sign * step, levels - sign * step
        driven = np.stack([rows[name] for name in stage.circuit.driven])
        start = np.full((len(stage.circuit.free), points), 0.5 * stage.supply)
        state, failed = steady_state(
            stage, stage.parameters, driven, start, _FIRST_STEP
        )
        outputs.append(np.where(failed, np.nan, state[y]))
    gain = np.abs(outputs[0] - outputs[1]) / (4.0 * step)
    gain = np.nan_to_num(gain)
    inside = levels[gain >= _LINEAR_PART * gain.max()]
    low, high = float(inside.min()), float(inside.max())
    return LinearRange(low, high, level, float(gain.max()), low <= level <= high)


def _out(network: Network) -> int:
    return network.circuit.free.index(network.circuit.outputs[0])
