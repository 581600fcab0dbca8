"""What moves the taps of a ladder: leads, bias, feedthrough, mismatch and noise; and the error power it costs."""

import numpy as np
from numpy.typing import NDArray
from scipy.constants import Boltzmann

from flashplan.ladder.network import Network, ac_voltages
from flashplan.ladder.straight import INPUT, at_taps
from flashplan.metrics.sine import sine_positions, sine_weights

Floats = NDArray[np.float64]

TEMPERATURE = 300.0  # K


def feedthrough_phasor(
    network: Network, comparators: int, frequency: float, amplitude: float
) -> NDArray[np.complex128]:
    """Movement of each tap for a sine at the input, as a phasor against that sine, in V: (M,).

    frequency in Hz, amplitude of the input in V.
    """
    return at_taps(
        network, ac_voltages(network, frequency, {INPUT: amplitude}), comparators
    )


def mismatch_sigma(
    bits: int, resistor_sigma: float, forced_taps: tuple[int, ...]
) -> Floats:
    """Sigma of each tap from unit resistors of a relative sigma, in LSB: (M,).

    s sqrt((k - a) (b - k) / (b - a)) between the held taps a and b on either side, the ends included.
    Source: random walk with pinned ends, closed form.

    >>> print(f"{mismatch_sigma(6, 0.01, ())[31]:.3f}")      # s sqrt(m) / 2
    0.040
    """
    taps = np.arange(1, 2**bits)
    pins = np.array(sorted({0, 2**bits, *forced_taps}))
    above = np.searchsorted(pins, taps, side="left")
    high = pins[above]
    low = pins[np.maximum(above - 1, 0)]
    return resistor_sigma * np.sqrt((taps - low) * (high - taps) / (high - low))


def noise_sigma(network: Network, comparators: int) -> Floats:
    """Thermal noise of each tap in V: (M,); 0 where the tap is held.

    Every resistor's 4 k T R, shaped by the network, adds up to sqrt(k T / C) at a node whatever the resistances.
    Source: equipartition of energy; H. Nyquist 1928 (memory). At 300 K.
    """
    capacitance = network.capacitance.diagonal()
    return at_taps(network, np.sqrt(Boltzmann * TEMPERATURE / capacitance), comparators)


def tap_error_power(
    kickback_lsb: Floats | None,
    feedthrough_lsb: NDArray[np.complex128] | None,
    noise_lsb: Floats | None,
    bits: int,
) -> float:
    """Error power of moving taps under a full-scale sine, in LSB^2; None for an effect that is not there.

    Feedthrough F acts when the input crosses the threshold: there the sine stands at x amplitudes and its quadrature at
    +-sqrt(1 - x^2), so that the mean square over both crossings is (Re F x)^2 + (Im F)^2 (1 - x^2).
    """
    weights, position = sine_weights(bits), sine_positions(bits)
    power = 0.0
    if kickback_lsb is not None:
        power += float(weights @ kickback_lsb**2)
    if feedthrough_lsb is not None:
        square = (feedthrough_lsb.real * position) ** 2 + feedthrough_lsb.imag**2 * (
            1.0 - position**2
        )
        power += float(weights @ square)
    if noise_lsb is not None:
        power += float(weights @ noise_lsb**2)
    return power
