"""A comparator as parts between named nodes, and the matrices that its node equations need."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.device import DeviceParameters, drain_current
from flashplan.cell.mismatch import device_sigma
from flashplan.cell.process import Polarity, Process

Floats = NDArray[np.float64]

# Voltages and slopes of all driven nodes at a time: two arrays (driven, instances or 1).
Drive = Callable[[float], tuple[Floats, Floats]]


@dataclass(frozen=True)
class Device:
    """One transistor; n-channel bulks are at ground, p-channel bulks at the supply. width, length in m."""

    name: str
    kind: str  # "n" or "p"
    drain: str
    gate: str
    source: str
    width: float
    length: float


@dataclass(frozen=True)
class Branch:
    """A resistor (ohm) or capacitor (F) between two nodes."""

    first: str
    second: str
    value: float


@dataclass(frozen=True)
class Circuit:
    """Parts of a cell. `free` nodes follow from the node equations, `driven` ones are given; "ground" is 0 V.

    outputs: the node that goes high for a positive input, and its complement ("" for a single-ended cell).
    """

    free: tuple[str, ...]
    driven: tuple[str, ...]
    devices: tuple[Device, ...]
    outputs: tuple[str, str]
    resistors: tuple[Branch, ...] = ()
    capacitors: tuple[Branch, ...] = ()

    @property
    def nodes(self) -> tuple[str, ...]:
        """Free nodes, then driven ones."""
        return self.free + self.driven


@dataclass(frozen=True)
class Network:
    """A circuit in a process, ready to be evaluated: C dv/dt = -currents(v, t) over (nodes, instances).

    gate, drain, source: node index of each device; sign: (devices, 1) +1 n-channel, -1 p-channel; capacitance and
    conductance: (nodes, nodes); leaving: (nodes, devices), +1 where a device's current leaves a node; area of each
    gate, threshold_sigma and beta_sigma of each device alone; noise_factor, flicker_factor by device.
    from_current, from_voltage, from_slope: the node equations solved for dv/dt of the free nodes.
    """

    circuit: Circuit
    supply: float
    temperature: float
    oxide_capacitance: float
    gate: NDArray[np.intp]
    drain: NDArray[np.intp]
    source: NDArray[np.intp]
    sign: Floats
    parameters: DeviceParameters
    capacitance: Floats
    conductance: Floats
    leaving: Floats
    area: Floats
    overlap: Floats
    threshold_sigma: Floats
    beta_sigma: Floats
    noise_factor: Floats
    flicker_factor: Floats
    from_current: Floats
    from_voltage: Floats
    from_slope: Floats


def build_network(
    circuit: Circuit, process: Process | Sequence[Process], supply: float
) -> Network:
    """Lay a circuit out in a process, or in several (corners, temperatures), one instance each.

    supply in V. Capacitances are constant: 2/3 W L C_ox between gate and source, overlap at both sides, junctions to
    the bulk; they are taken from the first process, since corners and temperatures share them.
    """
    processes = [process] if isinstance(process, Process) else list(process)
    first = processes[0]
    nodes = circuit.nodes
    index = {name: k for k, name in enumerate(nodes)}
    kinds = [_polarity(first, device) for device in circuit.devices]
    width = np.array([device.width for device in circuit.devices])
    length = np.array([device.length for device in circuit.devices])
    capacitance = np.zeros((len(nodes), len(nodes)))
    conductance = np.zeros_like(capacitance)
    leaving = np.zeros((len(nodes), len(circuit.devices)))
    for k, (device, kind) in enumerate(zip(circuit.devices, kinds, strict=True)):
        overlap = kind.overlap_capacitance * device.width
        channel = (2.0 / 3.0) * first.oxide_capacitance * device.width * device.length
        junction = kind.junction_capacitance * device.width
        gate, drain, source = (
            index[device.gate],
            index[device.drain],
            index[device.source],
        )
        _stamp(capacitance, gate, source, channel + overlap)
        _stamp(capacitance, gate, drain, overlap)
        capacitance[drain, drain] += junction
        capacitance[source, source] += junction
        sign = 1.0 if device.kind == "n" else -1.0
        leaving[drain, k] += sign
        leaving[source, k] -= sign
    for part in circuit.capacitors:
        _stamp(capacitance, index[part.first], index[part.second], part.value)
    for part in circuit.resistors:
        _stamp(conductance, index[part.first], index[part.second], 1.0 / part.value)
    free = len(circuit.free)
    inverse = np.linalg.inv(capacitance[:free, :free])
    column = np.array([[1.0] if d.kind == "n" else [-1.0] for d in circuit.devices])
    return Network(
        circuit=circuit,
        supply=supply,
        temperature=first.temperature,
        oxide_capacitance=first.oxide_capacitance,
        gate=np.array([index[d.gate] for d in circuit.devices]),
        drain=np.array([index[d.drain] for d in circuit.devices]),
        source=np.array([index[d.source] for d in circuit.devices]),
        sign=column,
        parameters=_parameters(circuit, processes, width, length),
        capacitance=capacitance,
        conductance=conductance,
        leaving=leaving,
        area=width * length,
        overlap=np.array([k.overlap_capacitance for k in kinds]) * width,
        threshold_sigma=device_sigma(
            np.array([k.threshold_matching for k in kinds]), width, length
        ),
        beta_sigma=device_sigma(
            np.array([k.beta_matching for k in kinds]), width, length
        ),
        noise_factor=np.array([[k.thermal_noise_factor] for k in kinds]),
        flicker_factor=np.array([k.flicker_noise for k in kinds]),
        from_current=np.ascontiguousarray(-inverse @ leaving[:free]),
        from_voltage=np.ascontiguousarray(-inverse @ conductance[:free]),
        from_slope=np.ascontiguousarray(-inverse @ capacitance[:free, free:]),
    )


def with_mismatch(
    parameters: DeviceParameters, threshold_shift: Floats, beta_shift: Floats
) -> DeviceParameters:
    """The same devices with threshold shifts in V and relative current shifts, each (devices, instances)."""
    return DeviceParameters(
        threshold=parameters.threshold + threshold_shift,
        slope=parameters.slope,
        specific_current=parameters.specific_current * (1.0 + beta_shift),
        saturation=parameters.saturation,
        early_voltage=parameters.early_voltage,
        thermal_voltage=parameters.thermal_voltage,
        gate_charge=parameters.gate_charge,
    )


def device_voltages(
    network: Network, voltages: Floats
) -> tuple[Floats, Floats, Floats]:
    """Gate, drain and source voltages of all devices as seen from their bulk, turned n-channel: (devices, instances).

    voltages: (nodes, instances).
    """
    sign = network.sign
    base = np.where(sign > 0, 0.0, network.supply)
    return (
        base + sign * voltages[network.gate],
        base + sign * voltages[network.drain],
        base + sign * voltages[network.source],
    )


def device_currents(
    network: Network, parameters: DeviceParameters, voltages: Floats
) -> Floats:
    """Drain currents in each device's own sense: (devices, instances), A."""
    return drain_current(parameters, *device_voltages(network, voltages))


def slopes(
    network: Network, parameters: DeviceParameters, drive: Drive
) -> Callable[[float, Floats], Floats]:
    """The right-hand side dv/dt = f(t, v) of the free nodes, v and result (free, instances), in V/s."""

    def right_hand_side(time: float, free: Floats) -> Floats:
        driven, driven_slope = drive(time)
        full = with_driven(free, driven)
        current = device_currents(network, parameters, full)
        result = apply_matrix(network.from_current, current)
        if network.circuit.resistors:
            result += apply_matrix(network.from_voltage, full)
        result += apply_matrix(network.from_slope, driven_slope)
        return result

    return right_hand_side


def apply_matrix(matrix: Floats, values: Floats) -> Floats:
    """matrix @ values for one matrix (rows, columns), or for one of each instance (instances, rows, columns).

    values: (columns, instances); result: (rows, instances).
    """
    if matrix.ndim == 2:
        return np.asarray(matrix @ values)
    wide = np.broadcast_to(values, (values.shape[0], matrix.shape[0]))
    return np.asarray(np.einsum("mrc,cm->rm", matrix, wide))


def stack_networks(networks: Sequence[Network]) -> Network:
    """Several sizings of one circuit as the instances of one network, for the node equations only.

    Equations and parameters become one per instance; all other fields are the first network's.
    """
    first = networks[0]
    return replace(
        first,
        parameters=DeviceParameters(
            *(
                np.concatenate(
                    [getattr(network.parameters, name) for network in networks], axis=1
                )
                for name in DeviceParameters.__dataclass_fields__
            )
        ),
        from_current=np.stack([network.from_current for network in networks]),
        from_voltage=np.stack([network.from_voltage for network in networks]),
        from_slope=np.stack([network.from_slope for network in networks]),
    )


def with_driven(free: Floats, driven: Floats) -> Floats:
    """All node voltages, (nodes, instances), from the free and the driven ones."""
    full = np.empty((free.shape[0] + driven.shape[0], free.shape[1]))
    full[: free.shape[0]] = free
    full[free.shape[0] :] = driven
    return full


def _polarity(process: Process, device: Device) -> Polarity:
    return process.nmos if device.kind == "n" else process.pmos


def _stamp(matrix: Floats, first: int, second: int, value: float) -> None:
    matrix[first, first] += value
    matrix[second, second] += value
    matrix[first, second] -= value
    matrix[second, first] -= value


def _parameters(
    circuit: Circuit, processes: Sequence[Process], width: Floats, length: Floats
) -> DeviceParameters:
    columns = []
    for process in processes:
        kinds = [_polarity(process, device) for device in circuit.devices]
        columns.append(device_parameters(process, kinds, width, length))
    return DeviceParameters(
        *(
            np.stack([getattr(column, name) for column in columns], axis=1)
            for name in DeviceParameters.__dataclass_fields__
        )
    )


def device_parameters(
    process: Process, kinds: Sequence[Polarity], width: Floats, length: Floats
) -> DeviceParameters:
    """The equation's parameters of some devices, each array (devices,); width, length in m."""
    u = process.thermal_voltage
    slope = np.array([k.slope_factor for k in kinds])
    factor = np.array([k.mobility_factor for k in kinds])
    velocity = np.array([k.saturation_velocity for k in kinds])
    mobility = factor / process.oxide_capacitance
    return DeviceParameters(
        threshold=np.array([k.threshold for k in kinds]),
        slope=slope,
        specific_current=2.0 * slope * factor * u * u * width / length,
        saturation=2.0 * mobility * u / (velocity * length),
        early_voltage=np.array([k.early_field for k in kinds]) * length,
        thermal_voltage=np.full(len(kinds), u),
        gate_charge=2.0 * slope * u * process.oxide_capacitance * width * length,
    )
