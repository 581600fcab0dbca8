"""A clocked cell linearised along its balanced decision: gain, offset, noise, sampling instant without a single draw."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.bench.noise import FLICKER_BAND
from flashplan.cell.bench.setup import Setup, clock_drive, output_rows, reset_state, run
from flashplan.cell.circuit import (
    Network,
    device_voltages,
    stack_networks,
    with_driven,
    with_mismatch,
)
from flashplan.cell.device import channel_state
from flashplan.cell.device_noise import (
    flicker_voltage_variance,
    thermal_current_density,
)

Floats = NDArray[np.float64]

_PROBE = 1e-5  # V, of the difference quotients
_RESTING = 0.02  # part of the supply that no node moves by in a twentieth of the decision once it has settled
_EARLIER = 12  # intervals of the reset before the decision, each twice as long as the one after it
_WITHIN = 0.1  # regeneration has started once the response keeps within this part of the exponential


@dataclass(frozen=True)
class LinearCell:
    """Of each sizing, (sizings,): regeneration tau s, gain and delay s; offset_sigma and noise_sigma V; sampling
    instant s after the clock's mid-edge. offset_by_device and noise_by_device: (devices, sizings), V."""

    tau: Floats
    gain: Floats
    delay: Floats
    offset_sigma: Floats
    noise_sigma: Floats
    instant: Floats
    offset_by_device: Floats
    noise_by_device: Floats


def linearise(setups: list[Setup]) -> LinearCell:
    """Small-signal behaviour of several sizings of one topology at once, under one clock.

    All sizings make a decision with equal inputs, which stays balanced; along it the differential equations
    d' = J(t) d + b(t) s are linear. With the adjoint response lambda(t) of the output difference,
      shift from a constant s: integral lambda b dt,  noise variance: integral (lambda b)^2 S / 2 dt,
    each over the input's own response to refer it to the input. tau is the growing mode's at the end.
    Thermal noise comes from every device, flicker noise as a shift of its threshold, mismatch by the area law.
    """
    base = setups[0]
    networks = [setup.network for setup in setups]
    stacked = replace(base, network=stack_networks(networks))
    time, states, driven = _balanced_decision(stacked)
    jacobian, by_input, by_threshold, current, density = _derivatives(
        stacked.network, states, driven, networks
    )
    h = np.diff(time)
    middle = 0.5 * (jacobian[1:] + jacobian[:-1])
    steps = _exponential(middle * h[:, None, None, None])
    plus, minus = output_rows(base.network)
    adjoint = np.zeros((time.size, len(setups), states.shape[1]))
    adjoint[-1, :, plus], adjoint[-1, :, minus] = 1.0, -1.0
    for k in range(h.size - 1, -1, -1):
        adjoint[k] = np.einsum("mji,mj->mi", steps[k], adjoint[k + 1])

    matrix = np.stack([network.from_current for network in networks])
    weight = np.einsum("kmn,mnd->kdm", adjoint, matrix)
    input_weight = np.einsum("kdm,kdm->km", weight, by_input)
    response = np.trapezoid(input_weight, time, axis=0)
    half = base.edge / 2.0
    instant = np.trapezoid(input_weight * (time - half)[:, None], time, axis=0)

    sigma_v = np.stack([network.threshold_sigma for network in networks], axis=1)
    sigma_b = np.stack([network.beta_sigma for network in networks], axis=1)
    threshold = np.trapezoid(weight * by_threshold, time, axis=0) / response
    beta = np.trapezoid(weight * current, time, axis=0) / response
    offset = np.hypot(threshold * sigma_v, beta * sigma_b)
    thermal = np.trapezoid(weight**2 * density / 2.0, time, axis=0) / response**2
    flicker = np.stack(
        [
            flicker_voltage_variance(
                n.flicker_factor, n.oxide_capacitance, n.area, *FLICKER_BAND
            )
            for n in networks
        ],
        axis=1,
    )
    noise = np.sqrt(thermal + threshold**2 * flicker)
    tau = 1.0 / np.linalg.eigvals(jacobian[-1]).real.max(axis=1)
    growth = _input_growth(steps, by_input, matrix, h, plus, minus)
    gain, delay = _regeneration(time - half, growth, tau)
    return LinearCell(
        tau=tau,
        gain=gain,
        delay=delay,
        offset_sigma=np.sqrt((offset**2).sum(axis=0)),
        noise_sigma=np.sqrt((noise**2).sum(axis=0)),
        instant=instant / response,
        offset_by_device=offset,
        noise_by_device=noise,
    )


def _balanced_decision(setup: Setup) -> tuple[Floats, Floats, Floats]:
    """Times (k,), free nodes (k, nodes, sizings) and driven nodes (k, driven, 1), the reset before it included."""
    network = setup.network
    sizings = network.from_current.shape[0]
    start = reset_state(setup, network.parameters, sizings)
    drive, breaks = clock_drive(setup, np.zeros(1), 0.0, None)
    before = [(0.0, start)]

    def resting(time: float, free: Floats) -> bool:
        passed, moved = time - before[0][0], np.abs(free - before[0][1]).max()
        before[0] = (time, free)
        window = setup.decision_time / 20.0
        return bool(
            time > 2.0 * setup.edge
            and moved / passed * window < _RESTING * network.supply
        )

    path = run(
        setup,
        network.parameters,
        drive,
        start,
        (0.0, setup.edge / 2.0 + setup.decision_time),
        breaks,
        resting,
    )
    earlier = -setup.reset_time * 2.0 ** -np.arange(_EARLIER, dtype=float)
    time = np.concatenate([earlier, path.time])
    states = np.concatenate([np.repeat(path.voltages[:1], _EARLIER, 0), path.voltages])
    driven = np.stack([drive(t)[0].copy() for t in time])
    return time, states, driven


def _derivatives(
    network: Network, states: Floats, driven: Floats, networks: list[Network]
) -> tuple[Floats, Floats, Floats, Floats, Floats]:
    """Jacobian (k, sizings, nodes, nodes); then, each (k, devices, sizings): change of current with the plus input and
    with the threshold, in A/V; current A; density of thermal noise A^2/Hz."""
    k, nodes, sizings = states.shape
    flat = np.moveaxis(states, 1, 0).reshape(nodes, k * sizings)
    given = np.repeat(np.moveaxis(driven, 1, 0)[:, :, 0], sizings, axis=1)
    full = with_driven(flat, given)
    parameters = replace(
        network.parameters,
        **{
            name: np.tile(values, (1, k))
            for name, values in vars(network.parameters).items()
        },
    )
    devices = network.sign.shape[0]

    def currents(voltages: Floats) -> Floats:
        return channel_state(parameters, *device_voltages(network, voltages)).current

    def split(values: Floats) -> Floats:
        return np.moveaxis(values.reshape(devices, k, sizings), 0, 1)

    base = channel_state(parameters, *device_voltages(network, full))
    jacobian = np.empty((k, sizings, nodes, nodes))
    for j in range(nodes):
        moved = full.copy()
        moved[j] += _PROBE
        change = split((currents(moved) - base.current) / _PROBE)
        jacobian[..., j] = np.einsum("mnd,kdm->kmn", network.from_current, change)
    if network.circuit.resistors:
        jacobian += network.from_voltage[None, :, :, :nodes]
    moved = full.copy()
    moved[network.circuit.nodes.index("plus")] += _PROBE
    by_input = split((currents(moved) - base.current) / _PROBE)
    shifted = with_mismatch(parameters, np.array(_PROBE), np.array(0.0))
    raised = channel_state(shifted, *device_voltages(network, full)).current
    density = thermal_current_density(parameters, base, networks[0].noise_factor)
    return (
        jacobian,
        by_input,
        split((raised - base.current) / _PROBE),
        split(base.current),
        split(density),
    )


def _exponential(matrix: Floats) -> Floats:
    """exp of each matrix of a stack, by its (2, 2) Pade approximant: error of fifth order, stable for stiff modes."""
    one = np.eye(matrix.shape[-1])
    square = matrix @ matrix / 12.0
    return np.asarray(
        np.linalg.solve(one - matrix / 2.0 + square, one + matrix / 2.0 + square)
    )


def _input_growth(
    steps: Floats,
    by_input: Floats,
    matrix: Floats,
    h: Floats,
    plus: int,
    minus: int,
) -> Floats:
    """Output difference per volt of input at each time, (k, sizings)."""
    source = np.einsum("mnd,kdm->kmn", matrix, by_input)
    state = np.zeros_like(source[0])
    growth = [state[:, plus] - state[:, minus]]
    for k in range(h.size):
        push = 0.5 * h[k] * source[k]
        state = np.einsum("mij,mj->mi", steps[k], state + push)
        state = state + 0.5 * h[k] * source[k + 1]
        growth.append(state[:, plus] - state[:, minus])
    return np.array(growth)


def _regeneration(time: Floats, growth: Floats, tau: Floats) -> tuple[Floats, Floats]:
    """Gain and delay of v = gain v_in exp((t - delay) / tau) from the response, as the transient bench defines them."""
    gain, delay = np.empty(tau.size), np.empty(tau.size)
    for m in range(tau.size):
        line = growth[-1, m] * np.exp((time - time[-1]) / tau[m])
        apart = np.abs(growth[:, m] / line - 1.0)
        off = np.flatnonzero(apart > _WITHIN)
        k = int(off[-1]) if off.size else 0
        k = min(k, time.size - 2)
        # Where the distance passes the limit between two points, taken linearly, so that sizes move it smoothly.
        near, far = apart[k + 1], min(apart[k], 10.0)
        part = (far - _WITHIN) / (far - near) if far > near else 1.0
        delay[m] = time[k] + min(max(part, 0.0), 1.0) * (time[k + 1] - time[k])
        gain[m] = abs(growth[-1, m]) * np.exp(-(time[-1] - delay[m]) / tau[m])
    return gain, delay
