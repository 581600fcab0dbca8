"""Small shifts referred to the input: what an equal output at the start of regeneration would have taken."""

from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.cell.bench.setup import DECIDED, Setup, decide
from flashplan.cell.circuit import with_mismatch
from flashplan.cell.device import DeviceParameters

Floats = NDArray[np.float64]

_PROBE = 10e-6  # V at the input: small against any device's linear range, large against rounding
_LINEAR = (
    0.05  # part of the supply up to which a differential output grows in proportion
)


def input_referred(
    setup: Setup,
    parameters: DeviceParameters,
    start: Floats,
    ramp: ArrayLike = 0.0,
    difference: ArrayLike = 0.0,
) -> Floats:
    """Input voltage that would have moved each instance's output as far as it has moved, (instances,), V.

    start: reset states (nodes, instances); parameters of as many instances, or one for all; ramp V/s and difference V
    of the input. The output at the last instant at which all instances are still in the linear range is divided by the
    response of the same instances to a probe of 10 uV at the input. Exact to first order in the shift.
    """
    instances = start.shape[1]
    given = np.broadcast_to(difference, (instances,))
    rate = np.broadcast_to(ramp, (instances,))
    both = decide(
        replace(setup, tolerance=min(setup.tolerance, 1e-5)),
        _twice(parameters, instances),
        np.concatenate([start, start], axis=1),
        np.concatenate([given, given + _PROBE]),
        np.concatenate([rate, rate]),
        until=DECIDED,
    )
    apart = np.abs(both.output).max(axis=1)
    late = both.time > setup.edge / 2.0
    inside = np.flatnonzero(late & (apart < _LINEAR * setup.network.supply))
    row = inside[-1] if inside.size else int(np.argmax(late))
    output = both.output[row]
    response = output[instances:] - output[:instances]
    result: Floats = _PROBE * output[:instances] / response
    return result


def shifted_each(
    setup: Setup, threshold: ArrayLike, current: ArrayLike
) -> DeviceParameters:
    """Parameters of 4 D instances for D devices: threshold up, down, then current up, down, one device at a time.

    threshold V and current (relative): the size of each device's shift, (D,).
    """
    devices = len(setup.network.circuit.devices)
    by_threshold = np.diag(np.broadcast_to(threshold, (devices,)).astype(float))
    by_current = np.diag(np.broadcast_to(current, (devices,)).astype(float))
    none = np.zeros((devices, devices))
    return with_mismatch(
        setup.network.parameters,
        np.concatenate([by_threshold, -by_threshold, none, none], axis=1),
        np.concatenate([none, none, by_current, -by_current], axis=1),
    )


def central_differences(values: Floats) -> tuple[Floats, Floats]:
    """Half differences of `shifted_each`'s instances: effect of each device's threshold and current, (D,) each."""
    up, down, more, less = np.split(values, 4)
    return (up - down) / 2.0, (more - less) / 2.0


def _twice(parameters: DeviceParameters, instances: int) -> DeviceParameters:
    def doubled(values: Floats) -> Floats:
        full = np.broadcast_to(values, (values.shape[0], instances))
        return np.concatenate([full, full], axis=1)

    return replace(
        parameters,
        **{
            name: doubled(values)
            for name, values in vars(parameters).items()
            if values.shape[1] > 1
        },
    )
