"""Drain current of a MOS transistor: one charge-based equation for all regions, with velocity saturation."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.charge import inversion_charge

Floats = NDArray[np.float64]

_STEP = 1e-4  # V, of central differences: relative error about (step / U_T)^2 / 6, a few 1e-6


@dataclass(frozen=True)
class DeviceParameters:
    """What the equation needs of each device; arrays that broadcast to (devices, instances).

    threshold V (positive for both polarities); slope factor n; specific current 2 n mu C_ox U_T^2 W/L in A;
    saturation: lambda_c = 2 mu U_T / (v_sat L), the part of the channel in velocity saturation; early_voltage V;
    thermal_voltage U_T in V; gate_charge: 2 n U_T C_ox W L in C.
    """

    threshold: Floats
    slope: Floats
    specific_current: Floats
    saturation: Floats
    early_voltage: Floats
    thermal_voltage: Floats
    gate_charge: Floats


@dataclass(frozen=True)
class ChannelState:
    """Charges at the two channel ends (normalised, source side is the one at the lower voltage) and the current."""

    source_charge: Floats
    drain_charge: Floats
    current: Floats


def channel_state(
    parameters: DeviceParameters, gate: Floats, drain: Floats, source: Floats
) -> ChannelState:
    """Charges and current of an n-channel device; voltages in V from its bulk, any shape that broadcasts.

    With v_p = (v_g - V_T) / n, ends a at min(v_d, v_s) and b at the other, q = inversion charge at each end:
      q_a at v_p - a,  q_sat = L (q_a + q_a^2) / (2 + L + L q_a)           (L = lambda_c: carriers at v_sat at the drain)
      v_sat = U_T (2 (q_a - q_sat) + ln(q_a / q_sat)),  x = (b - a) / v_sat,  v_e = (b - a) / (1 + x^4)^(1/4)
      q_b at v_p - a - v_e
      i = (q_a - q_b)(1 + q_a + q_b) / (1 + w L (q_a - q_b) / 2),  w = z^2 / (1 + z^2),  z = (b - a) / U_T
      I = I_spec i (1 + (b - a - v_e) / V_A), signed from drain to source.
    Smooth in all terminals (three derivatives at v_d = v_s); symmetric; square law and exponential are its limits.
    Sources: C. Enz, F. Krummenacher, E. Vittoz, 1995 (charge law); C. Sodini, P. Ko, J. Moll, IEEE Trans. Electron
    Devices 31(10), 1984 (velocity against field). Both from memory; the blends over x and z are this project's choice.
    """
    p = parameters
    low = np.minimum(drain, source)
    across = np.abs(drain - source)
    over = (gate - p.threshold) / p.slope - low
    at_source = inversion_charge(over / p.thermal_voltage)
    to_saturation = (2.0 + p.saturation + p.saturation * at_source) / (
        p.saturation * (1.0 + at_source)
    )
    saturated = at_source / to_saturation
    full = p.thermal_voltage * (2.0 * (at_source - saturated) + np.log(to_saturation))
    ratio = across / (full + 1e-9)  # full is 0 only at charges that no circuit reaches
    ratio *= ratio
    effective = across / np.sqrt(np.sqrt(1.0 + ratio * ratio))
    at_drain = inversion_charge((over - effective) / p.thermal_voltage)
    step = at_source - at_drain
    # The field counts by its magnitude; fading it in over U_T keeps that smooth through zero.
    field = across / p.thermal_voltage
    field *= field
    field = field / (1.0 + field) * step
    current = (
        p.specific_current
        * step
        * (1.0 + at_source + at_drain)
        / (1.0 + 0.5 * p.saturation * field)
        * (1.0 + (across - effective) / p.early_voltage)
    )
    return ChannelState(
        at_source, at_drain, np.where(drain >= source, current, -current)
    )


def drain_current(
    parameters: DeviceParameters, gate: Floats, drain: Floats, source: Floats
) -> Floats:
    """Current from drain to source in A; see `channel_state`."""
    return channel_state(parameters, gate, drain, source).current


def mean_charge(state: ChannelState) -> Floats:
    """Mean normalised inversion charge along the channel.

    (2/3 (a^2 + a b + b^2) + (a + b)/2) / (1 + a + b), from dx proportional to (1 + 2 q) dq: two thirds of the source's
    charge in saturation and strong inversion, half of it in weak inversion.
    """
    a, b = state.source_charge, state.drain_charge
    return ((2.0 / 3.0) * (a * a + a * b + b * b) + 0.5 * (a + b)) / (1.0 + a + b)


@dataclass(frozen=True)
class SmallSignal:
    """At one bias: current A; gm, gds, gms (source transconductance) S; inversion coefficient; gm over current 1/V."""

    current: Floats
    transconductance: Floats
    output_conductance: Floats
    source_transconductance: Floats
    inversion: Floats
    efficiency: Floats


def small_signal(
    parameters: DeviceParameters, gate: Floats, drain: Floats, source: Floats
) -> SmallSignal:
    """Conductances by central differences of the current over 0.1 mV (relative error a few 1e-6).

    The inversion coefficient is q + q^2 at the source, gm over current that of the whole device.
    """
    h = _STEP
    state = channel_state(parameters, gate, drain, source)

    def slope(gate_step: float, drain_step: float, source_step: float) -> Floats:
        up = drain_current(
            parameters, gate + gate_step, drain + drain_step, source + source_step
        )
        down = drain_current(
            parameters, gate - gate_step, drain - drain_step, source - source_step
        )
        return (up - down) / (2.0 * h)

    gm = slope(h, 0.0, 0.0)
    charge = state.source_charge
    return SmallSignal(
        current=state.current,
        transconductance=gm,
        output_conductance=slope(0.0, h, 0.0),
        source_transconductance=-slope(0.0, 0.0, h),
        inversion=charge + charge * charge,
        efficiency=gm / np.maximum(np.abs(state.current), 1e-30),
    )


def transit_frequency(transconductance: Floats, capacitance: Floats) -> Floats:
    """Frequency of unit current gain, gm / (2 pi C_gate), in Hz; S and F."""
    return transconductance / (2.0 * np.pi * capacitance)
