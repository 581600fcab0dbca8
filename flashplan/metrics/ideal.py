"""The ceiling: what an ideal quantiser makes of a full-scale sine, exactly, and effective bits against it."""

import math
from typing import overload

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.sine import sine_positions

# An ideal converter's error counted as LSB^2/12 against a full-scale sine: 6.02 dB per bit, and 1.76 dB.
DB_PER_BIT = 20.0 * math.log10(2.0)
DB_OFFSET = 10.0 * math.log10(1.5)


def ideal_signal_amplitude_lsb(bits: int) -> float:
    """Amplitude in LSB of the sine that fits an ideal quantiser's output best, for a full-scale sine at its input.

    b1 = (2/pi) sum_k sqrt(1 - x_k**2), one term for each threshold at x_k amplitudes from the middle: the fundamental
    of the square wave that each threshold makes of the sine.
    Source: Fourier series of a sum of square waves; closed form.

    >>> print(f"{ideal_signal_amplitude_lsb(1):.6f}")   # one threshold: 2/pi
    0.636620
    """
    return 2.0 / math.pi * math.fsum(np.sqrt(1.0 - sine_positions(bits) ** 2))


def ideal_error_power_lsb2(bits: int) -> float:
    """Error power in LSB**2 of an ideal quantiser about the sine fitted to its output, for a full-scale sine.

    sum_c P(c) (c - (2**bits - 1)/2)**2 - b1**2 / 2, with P(c) the share of time that an arcsine law spends in code c
    and b1 from ideal_signal_amplitude_lsb. It goes to 1/12 with many bits, from 4 bits on from above: 3.9 % more at 6
    bits, 0.8 % at 12. Rounding error under 1e-9 LSB**2 at 12 bits.
    Source: W. R. Bennett, "Spectra of quantized signals", Bell Syst. Tech. J. 27, 1948 (the 1/12; memory).

    >>> print(f"{ideal_error_power_lsb2(1):.6f}")   # a square wave of 1/2 without its fundamental: 1/4 - 2/pi**2
    0.047358
    """
    edges = np.concatenate(([-1.0], sine_positions(bits), [1.0]))
    shares = np.diff(np.arcsin(edges)) / math.pi
    levels = np.arange(2**bits) - (2**bits - 1) / 2.0
    power = math.fsum(shares * levels**2)
    return power - ideal_signal_amplitude_lsb(bits) ** 2 / 2.0


def ideal_sndr_db(bits: int) -> float:
    """SNDR in dB of an ideal quantiser for a full-scale sine, measured about the fitted sine: no converter beats it.

    >>> print(f"{ideal_sndr_db(1):.3f} {ideal_sndr_db(8):.3f}")   # 6.02 N + 1.76 would say 7.78 and 49.93
    6.313 49.813
    """
    signal = ideal_signal_amplitude_lsb(bits) ** 2 / 2.0
    return 10.0 * math.log10(signal / ideal_error_power_lsb2(bits))


@overload
def enob_from_sndr(sndr_db: float) -> float: ...
@overload
def enob_from_sndr(sndr_db: NDArray[np.float64]) -> NDArray[np.float64]: ...
def enob_from_sndr(
    sndr_db: float | NDArray[np.float64],
) -> float | NDArray[np.float64]:
    """Effective bits: (SNDR - 10 log10(1.5)) / (20 log10(2)), for a sine that fills the range.

    sndr_db: dB, a float or an array. Source: IEEE Std 1241-2010, effective number of bits (memory).

    >>> print(f"{enob_from_sndr(49.93):.2f}")
    8.00
    """
    return (sndr_db - DB_OFFSET) / DB_PER_BIT


@overload
def sndr_from_enob(enob: float) -> float: ...
@overload
def sndr_from_enob(enob: NDArray[np.float64]) -> NDArray[np.float64]: ...
def sndr_from_enob(
    enob: float | NDArray[np.float64],
) -> float | NDArray[np.float64]:
    """SNDR in dB of so many effective bits; undoes enob_from_sndr.

    >>> print(f"{sndr_from_enob(8.0):.2f}")   # handbooks round to 6.02 N + 1.76, 49.92
    49.93
    """
    return DB_PER_BIT * enob + DB_OFFSET
