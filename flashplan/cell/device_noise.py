"""Noise of MOS devices: thermal noise of the channel charge, flicker noise of the gate."""

import math

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.device import ChannelState, DeviceParameters, mean_charge
from flashplan.cell.process import BOLTZMANN, ELECTRON

Floats = NDArray[np.float64]


def thermal_current_density(
    parameters: DeviceParameters, state: ChannelState, factor: Floats
) -> Floats:
    """One-sided spectral density of the drain current's thermal noise, in A^2/Hz.

    S = 4 k T factor (I_spec / U_T) q_mean, which is 4 k T mu Q / L^2: 4 k T (2/3) gms in saturation and strong
    inversion, 2 q I in weak inversion. Source: C. Enz, E. Vittoz, "Charge-based MOS Transistor Modeling", 2006 (memory).
    """
    # k T / U_T is the electron's charge.
    return 4.0 * ELECTRON * factor * parameters.specific_current * mean_charge(state)


def flicker_voltage_variance(
    factor: Floats, oxide_capacitance: float, area: Floats, low: float, high: float
) -> Floats:
    """Variance of the gate voltage from flicker noise between two frequencies in Hz: K ln(high/low) / (C_ox W L), V^2."""
    return factor / (oxide_capacitance * area) * math.log(high / low)


def sampled_noise(capacitance: float, temperature: float) -> float:
    """Root-mean-square voltage sampled on a capacitor, sqrt(k T / C).

    >>> print(f"{sampled_noise(1e-12, 300.0) * 1e6:.1f} uV")
    64.4 uV
    """
    return math.sqrt(BOLTZMANN * temperature / capacitance)
