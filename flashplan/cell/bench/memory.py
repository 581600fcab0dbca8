"""What a clocked cell remembers of the decision before: its hysteresis."""

import numpy as np

from flashplan.cell.bench.linear import input_referred
from flashplan.cell.bench.setup import Setup, clock_drive, reset_state, run

_BEFORE = 0.1  # V, overdrive of the decision that is to be remembered


def measure_memory(setup: Setup) -> float:
    """Width between the two trip points after a large decision either way and one reset time, in V.

    The input rests at the threshold during that reset, so that only the cell's own nodes can remember.
    """
    network = setup.network
    start = np.repeat(reset_state(setup, network.parameters, 1), 2, 1)
    high = setup.decision_time + setup.edge / 2.0
    drive, breaks = clock_drive(setup, np.array([_BEFORE, -_BEFORE]), 0.0, None)
    decided = run(setup, network.parameters, drive, start, (0.0, high), breaks)
    drive, breaks = clock_drive(setup, np.zeros(2), None, 0.0)
    ready = run(
        setup,
        network.parameters,
        drive,
        decided.voltages[-1],
        (0.0, setup.reset_time),
        breaks,
    )
    shift = input_referred(setup, network.parameters, ready.voltages[-1])
    return float(abs(shift[0] - shift[1]))
