"""What a clocked cell is measured with: network, clock, inputs; and the drives that follow from them."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.cell.circuit import Drive, Network, slopes
from flashplan.cell.device import DeviceParameters
from flashplan.cell.integrate import Trajectory, integrate
from flashplan.cell.steady import steady_state

Floats = NDArray[np.float64]

# A differential output this part of the supply apart has left the linear range: its sign cannot turn any more.
DECIDED = 0.25

_RESETS = 3.0  # reset times that make a long reset


@dataclass(frozen=True)
class Setup:
    """common_mode: voltage of the reference input; edge: rise time of the clock; bias: voltage of the node "bias".

    decision_time: from the clock's mid-edge to the end of the decision; reset_time: the other part of the period.
    tolerance: local error per step as a part of the supply; lead: how long before the clock's edge the input is there,
    for cells whose first stage follows it all the time.
    """

    network: Network
    common_mode: float
    edge: float
    decision_time: float
    reset_time: float
    bias: float = 0.0
    tolerance: float = 1e-4
    lead: float = 0.0

    @property
    def valid_level(self) -> float:
        """Differential output that counts as decided, in V: half the supply."""
        return self.network.supply / 2.0


@dataclass(frozen=True)
class Decision:
    """A run after a clock edge at time 0: time from mid-edge (steps,), differential output (steps, instances) in V."""

    time: Floats
    output: Floats
    trajectory: Trajectory


def clock_drive(
    setup: Setup,
    difference: ArrayLike,
    rise: float | None,
    fall: float | None,
    ramp: ArrayLike = 0.0,
) -> tuple[Drive, list[float]]:
    """Drive with the clock high between `rise` and `fall` (None: never), and the times of its corners.

    The signal input stands `difference` V above the reference input at time 0 and moves by `ramp` V/s; both broadcast
    to (instances,). Clock edges are raised cosines, so that the drive has a continuous slope.
    """
    supply, edge = setup.network.supply, setup.edge
    offset, rate = np.broadcast_arrays(np.atleast_1d(difference), np.atleast_1d(ramp))
    width = offset.size
    fixed = {"ground": 0.0, "supply": supply, "bias": setup.bias}
    names = setup.network.circuit.driven
    values, rates = np.zeros((len(names), width)), np.zeros((len(names), width))
    for k, name in enumerate(names):
        values[k] = fixed.get(name, setup.common_mode)
        if name == "plus":
            rates[k] = rate
    row = {name: k for k, name in enumerate(names)}

    def drive(time: float) -> tuple[Floats, Floats]:
        high, slope = 0.0, 0.0
        for start, sign in ((rise, 1.0), (fall, -1.0)):
            if start is not None:
                part, pace = _edge((time - start) / edge)
                high += sign * part
                slope += sign * pace / edge
        values[row["plus"]] = setup.common_mode + offset + rate * time
        if rise is None and fall is not None:
            high += 1.0
        values[row["clock"]], rates[row["clock"]] = supply * high, supply * slope
        if "clock_b" in row:
            values[row["clock_b"]] = supply * (1.0 - high)
            rates[row["clock_b"]] = -supply * slope
        return values, rates

    breaks = [
        t for start in (rise, fall) if start is not None for t in (start, start + edge)
    ]
    return drive, breaks


def _edge(phase: float) -> tuple[float, float]:
    """Raised cosine from 0 to 1 over one unit, and its slope."""
    if phase <= 0.0:
        return 0.0, 0.0
    if phase >= 1.0:
        return 1.0, 0.0
    return 0.5 - 0.5 * np.cos(np.pi * phase), 0.5 * np.pi * np.sin(np.pi * phase)


def reset_state(setup: Setup, parameters: DeviceParameters, instances: int) -> Floats:
    """Free nodes at the end of a long reset, with equal inputs: (nodes, instances). No decision before it is remembered."""
    guess = np.empty((len(setup.network.circuit.free), instances))
    start = {
        "tail": max(0.0, setup.common_mode - 0.4 * setup.network.supply),
        "pair": max(0.0, setup.common_mode - 0.4 * setup.network.supply),
        "top": 0.3 * setup.network.supply,
    }
    held_low = "clock_b" in setup.network.circuit.driven
    for k, name in enumerate(setup.network.circuit.free):
        high = 0.0 if held_low and name.startswith("out") else setup.network.supply
        guess[k] = start.get(name, high)
    drive, _ = clock_drive(setup, np.zeros(1), None, None)
    state, failed = steady_state(
        setup.network,
        parameters,
        np.repeat(drive(0.0)[0], instances, axis=1),
        guess,
        setup.edge / 50.0,
        duration=_RESETS * setup.reset_time,
    )
    # An instance that could not be reset is no comparator: not a number, it fails in whatever run follows.
    return np.where(failed, np.nan, state)


def decide(
    setup: Setup,
    parameters: DeviceParameters,
    start: Floats,
    difference: ArrayLike,
    ramp: ArrayLike = 0.0,
    until: float | None = None,
    time: float | None = None,
) -> Decision:
    """One decision of all instances from a reset state.

    difference V and ramp V/s of the input, (instances,) or scalar; time: length of the run from mid-edge, the setup's
    decision time if None; until ends it once every instance's outputs are that part of the supply apart.
    """
    half = setup.edge / 2.0
    drive, breaks = clock_drive(
        setup,
        np.broadcast_to(difference, (start.shape[1],)) - np.asarray(ramp) * half,
        0.0,
        None,
        ramp,
    )
    plus, minus = output_rows(setup.network)

    def decided(time: float, voltages: Floats) -> bool:
        if until is None or time <= setup.edge:
            return False
        apart = np.abs(voltages[plus] - voltages[minus])
        return bool(apart.min() > until * setup.network.supply)

    length = setup.decision_time if time is None else time
    path = run(
        setup,
        parameters,
        drive,
        start,
        (-setup.lead, half + length),
        [0.0, *breaks],
        decided,
    )
    return Decision(
        path.time - half, path.voltages[:, plus] - path.voltages[:, minus], path
    )


def output_rows(network: Network) -> tuple[int, int]:
    """Rows of the two outputs among the free nodes."""
    first, second = network.circuit.outputs
    free = network.circuit.free
    return free.index(first), free.index(second)


def run(
    setup: Setup,
    parameters: DeviceParameters,
    drive: Drive,
    start: Floats,
    times: tuple[float, float],
    breaks: list[float] | None = None,
    stop: Callable[[float, Floats], bool] | None = None,
) -> Trajectory:
    """Integrate the setup's network under any drive; see `integrate`."""
    return integrate(
        slopes(setup.network, parameters, drive),
        start,
        times,
        setup.tolerance * setup.network.supply,
        breaks or [],
        stop,
    )
