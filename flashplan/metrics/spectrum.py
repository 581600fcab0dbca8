"""Spectrum of a coherently sampled sine: SNDR, SFDR, THD, effective bits, noise floor."""

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.metrics.ideal import enob_from_sndr

HARMONICS = tuple(range(2, 11))  # the second to the tenth, as IEEE Std 1241 advises
_CHUNK_SAMPLES = 2**21  # of all rows that are transformed together: some 50 MB


@dataclass(frozen=True, slots=True)
class SineMetrics:
    """What a record of a sine says of the converter; each field (arrays,), one entry per record.

    Powers in squared units of the samples (codes**2 for codes); ratios in dB against the signal. `error_power` is all
    but dc and the signal. `noise_floor_db` is the mean power of the bins that hold neither dc, signal nor harmonics.
    """

    sndr_db: NDArray[np.float64]
    sfdr_db: NDArray[np.float64]
    thd_db: NDArray[np.float64]
    enob: NDArray[np.float64]
    noise_floor_db: NDArray[np.float64]
    signal_power: NDArray[np.float64]
    error_power: NDArray[np.float64]

    def to_dict(self) -> dict[str, Any]:
        """Return the fields as plain lists."""
        return {name: getattr(self, name).tolist() for name in self.__slots__}


def coherent_frequency(
    sample_rate: float, target: float, samples: int
) -> tuple[int, float]:
    """Return the whole number of cycles in a record, and its frequency in Hz, that lies nearest to a target.

    sample_rate, target in Hz; samples: length of the record. The cycles are odd and share no factor with the length,
    so that the record visits `samples` different phases of the sine: neither half nor a quarter of the sample rate,
    where few phases repeat, can be chosen. Of two equally near the lower wins. A target above half the sample rate is
    kept there; the spectrum folds it.
    Raises ValueError for a rate or target that is not positive and for fewer than 16 samples.
    Source: IEEE Std 1241-2010, choice of the test frequency (memory).

    >>> coherent_frequency(2e9, 1e9, 65536)[0], coherent_frequency(1e9, 100e6, 4096)
    (32767, (409, 99853515.625))
    """
    if not (sample_rate > 0 and target > 0) or samples < 16:
        raise ValueError(
            f"a sample rate and target above zero and 16 samples or more are needed, "
            f"found {sample_rate!r}, {target!r} and {samples}"
        )
    wanted = target / sample_rate * samples
    # One is always fit, so that the search below ends.
    nearest = max(1, math.ceil(wanted))
    below, above = nearest - 1, nearest
    while below > 1 and not _visits_all_phases(below, samples):
        below -= 1
    while not _visits_all_phases(above, samples):
        above += 1
    cycles = below if below >= 1 and wanted - below <= above - wanted else above
    return cycles, cycles * sample_rate / samples


def _visits_all_phases(cycles: int, samples: int) -> bool:
    return cycles % 2 == 1 and math.gcd(cycles, samples) == 1


def folded_bin(cycles: int, samples: int) -> int:
    """Return the bin of a real record's spectrum at which so many cycles appear.

    >>> folded_bin(3, 16), folded_bin(13, 16), folded_bin(19, 16)
    (3, 3, 3)
    """
    return min(cycles % samples, -cycles % samples)


def power_spectrum(records: ArrayLike) -> NDArray[np.float64]:
    """Return the one-sided power spectrum of records (..., n): (..., n//2 + 1), in squared units of the samples.

    Each bin holds the power that its frequency has in the record, so that the sum over bins is the mean square
    (Parseval) and a sine of amplitude A on a bin shows A**2/2 there.
    """
    samples = np.asarray(records, dtype=np.float64)
    length = samples.shape[-1]
    power = np.abs(np.fft.rfft(samples, axis=-1)) ** 2 / length**2
    power[..., 1 : (length + 1) // 2] *= 2.0  # all but dc and half the sample rate
    return power


def sine_metrics(codes: ArrayLike, cycles: int) -> SineMetrics:
    """Measure records of a coherently sampled sine.

    codes: (arrays, n) or (n,), in any unit; cycles: whole cycles of the sine in the record. The signal is the bin of
    `cycles` (folded), dc is removed, everything else is error; harmonics 2 to 10 that fold onto dc or the signal are
    not told from these. A record without any error gives infinite ratios.
    Raises ValueError for fewer than 16 samples, cycles that fold onto dc or half the sample rate, and a record without
    a signal. Source: IEEE Std 1241-2010, SINAD, SFDR, THD from the spectrum (memory).

    >>> phase = 2 * np.pi * 7 * np.arange(64) / 64
    >>> metrics = sine_metrics(np.sin(phase) + 0.01 * np.sin(3 * phase), 7)
    >>> print(f"{metrics.sndr_db[0]:.3f} {metrics.thd_db[0]:.3f}")
    40.000 -40.000
    """
    records = np.atleast_2d(np.asarray(codes, dtype=np.float64))
    arrays, length = records.shape
    signal_bin = folded_bin(cycles, length)
    if length < 16 or signal_bin == 0 or 2 * signal_bin == length:
        raise ValueError(
            f"{cycles} cycles in {length} samples do not stand clear of dc and half the sample rate"
        )
    harmonic_bins = sorted(
        {folded_bin(order * cycles, length) for order in HARMONICS} - {0, signal_bin}
    )
    error_bins = np.ones(length // 2 + 1, dtype=bool)
    error_bins[[0, signal_bin]] = False
    noise_bins = error_bins.copy()
    noise_bins[harmonic_bins] = False

    signal, error, spur, distortion, noise = np.empty((5, arrays))
    rows = max(1, _CHUNK_SAMPLES // length)
    for start in range(0, arrays, rows):
        part = slice(start, start + rows)
        power = power_spectrum(records[part])
        signal[part] = power[:, signal_bin]
        power[:, ~error_bins] = 0.0
        error[part] = power.sum(axis=1)
        spur[part] = power.max(axis=1)
        distortion[part] = power[:, harmonic_bins].sum(axis=1)
        noise[part] = (error[part] - distortion[part]) / max(1, noise_bins.sum())
    if not np.all(signal > 0.0):
        raise ValueError(
            f"record {int(np.argmin(signal > 0.0))} has no sine of {cycles} cycles"
        )
    sndr_db = ratio_db(signal, error)
    return SineMetrics(
        sndr_db=sndr_db,
        sfdr_db=ratio_db(signal, spur),
        thd_db=-ratio_db(signal, distortion),
        enob=enob_from_sndr(sndr_db),
        noise_floor_db=-ratio_db(signal, np.maximum(noise, 0.0)),
        signal_power=signal,
        error_power=error,
    )


def ratio_db(
    signal: NDArray[np.float64], other: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return the ratio of two powers in dB; infinite where the other is nil."""
    with np.errstate(divide="ignore"):
        return 10.0 * np.log10(signal / other)
