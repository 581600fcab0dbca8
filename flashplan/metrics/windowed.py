"""Spectrum of a sine that is not coherent with the record: a named window, and the bins over which it leaks."""

from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.signal import get_window

from flashplan.metrics.ideal import enob_from_sndr
from flashplan.metrics.spectrum import HARMONICS, SineMetrics, ratio_db

Window = Literal["hann", "blackmanharris", "flattop"]


@dataclass(frozen=True, slots=True)
class Leakage:
    """Over how many bins to either side a window spreads a sine.

    lobe: half width of its main lobe, wide enough for a weak line; skirt: beyond it less than 1e-8 of the sine's power
    is left ("blackmanharris": 1e-9), so that the rest of the spectrum can be read for up to 12 bits.
    """

    lobe: int
    skirt: int


# Skirts as measured on a sine half way between two bins, the worst case.
WINDOWS: dict[Window, Leakage] = {
    "hann": Leakage(lobe=2, skirt=20),
    "blackmanharris": Leakage(lobe=4, skirt=8),
    "flattop": Leakage(lobe=5, skirt=6),
}


@dataclass(frozen=True, slots=True)
class WindowedMetrics:
    """Metrics of a record whose sine need not be coherent, and the sine's frequency in cycles per sample."""

    frequency: float
    sine: SineMetrics

    def to_dict(self) -> dict[str, Any]:
        """Return the fields as plain Python types."""
        return {"frequency": self.frequency, **self.sine.to_dict()}


def windowed_spectrum(record: ArrayLike, window: Window) -> NDArray[np.float64]:
    """Return the one-sided power spectrum of a windowed record without its mean: (n//2 + 1,), from (n,).

    Scaled by 1 / (n sum w**2), so that noise shows its power per bin as it would without a window, and a sine of
    amplitude A shows A**2/2 as the sum over its lobe.
    Source: F. J. Harris, "On the use of windows for harmonic analysis", Proc. IEEE 66(1), 1978 (memory).
    """
    samples = np.asarray(record, dtype=np.float64)
    length = samples.size
    weights = get_window(window, length)
    # The weighted mean leaves nothing of dc behind the window; the plain one would.
    centred = samples - weights @ samples / weights.sum()
    power = np.abs(np.fft.rfft(centred * weights)) ** 2
    power /= length * (weights @ weights)
    power[1 : (length + 1) // 2] *= 2.0
    return power


def windowed_metrics(
    record: ArrayLike, window: Window = "blackmanharris"
) -> WindowedMetrics:
    """Measure a record (n,) of one sine of any frequency.

    The largest line is the signal. The bins under its skirt, and under that of dc, are taken to hold as much error each
    as all others do on average. A harmonic counts over the width of a lobe. The largest spur is told from its highest
    bin, which shows up to 1.4 dB ("hann"), 0.8 dB ("blackmanharris") or 0.0 dB ("flattop") too little.
    Raises ValueError for an unknown window, a record too short for the skirts, one without a signal, and a signal so
    low or so near half the sample rate that its skirt is cut off.
    Source: IEEE Std 1241-2010, windowed spectrum of a non-coherent record (memory).

    >>> phase = 2 * np.pi * 0.1234567 * np.arange(4096)
    >>> found = windowed_metrics(np.sin(phase) + 0.01 * np.sin(2 * phase))
    >>> print(f"{found.frequency:.6f} {found.sine.sndr_db[0]:.1f} {found.sine.thd_db[0]:.1f}")
    0.123457 40.0 -40.0
    """
    samples = np.asarray(record, dtype=np.float64)
    if window not in WINDOWS:
        raise ValueError(f"window must be one of {', '.join(WINDOWS)}, found {window}")
    leakage, length = WINDOWS[window], samples.size
    if samples.ndim != 1 or length < 16 * leakage.skirt:
        raise ValueError(
            f"the window {window} needs one record of {16 * leakage.skirt} samples or more"
        )
    power = windowed_spectrum(samples, window)
    bins = power.size
    peak = int(np.argmax(power))
    if power[peak] == 0.0:
        raise ValueError("the record holds no signal")
    if not 2 * leakage.skirt < peak < bins - 1 - leakage.skirt:
        raise ValueError(
            f"the largest line, at {peak / length:.4g} of the sample rate, is too near dc or half the sample rate; "
            "choose another frequency, or a longer record"
        )
    skirt = slice(peak - leakage.skirt, peak + leakage.skirt + 1)
    signal = power[skirt].sum()
    place = float(np.arange(bins)[skirt] @ power[skirt] / signal)

    error_bins = np.ones(bins, dtype=bool)
    error_bins[: leakage.skirt + 1] = False
    error_bins[skirt] = False
    harmonic_bins = np.zeros(bins, dtype=bool)
    for order in HARMONICS:
        centre = round(length * _folded(order * place / length))
        harmonic_bins[max(0, centre - leakage.lobe) : centre + leakage.lobe + 1] = True
    harmonic_bins &= error_bins
    noise_bins = error_bins & ~harmonic_bins

    distortion = power[harmonic_bins].sum()
    # Harmonics are where they are; noise goes on under the skirts.
    noise_per_bin = power[noise_bins].mean()
    hidden = bins - np.count_nonzero(error_bins)
    error = power[error_bins].sum() + noise_per_bin * hidden
    weights = get_window(window, length)
    bandwidth = length * (weights @ weights) / weights.sum() ** 2  # in bins, of noise
    spur = power[error_bins].max() * bandwidth
    one = np.atleast_1d
    sndr_db = ratio_db(one(signal), one(error))
    return WindowedMetrics(
        frequency=place / length,
        sine=SineMetrics(
            sndr_db=sndr_db,
            sfdr_db=ratio_db(one(signal), one(spur)),
            thd_db=-ratio_db(one(signal), one(distortion)),
            enob=enob_from_sndr(sndr_db),
            noise_floor_db=-ratio_db(one(signal), one(noise_per_bin)),
            signal_power=one(signal),
            error_power=one(error),
        ),
    )


def _folded(frequency: float) -> float:
    """Fold a frequency in cycles per sample to where a spectrum shows it, 0 to 1/2."""
    rest = frequency % 1.0
    return min(rest, 1.0 - rest)
