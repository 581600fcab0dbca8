"""Least-squares sine through a record: three parameters at a known frequency, four where it is to be found."""

import math
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.metrics.windowed import windowed_metrics

_STEPS = 30  # of the four-parameter fit; it takes three or four from a good start


@dataclass(frozen=True, slots=True)
class SineFit:
    """offset + amplitude cos(2 pi frequency n + phase), n = 0, 1, ..., and the rms of what it leaves of the record.

    Amplitude, offset and residual in the record's unit, frequency in cycles per sample, phase in radians.
    """

    amplitude: float
    frequency: float
    phase: float
    offset: float
    residual_rms: float

    def to_dict(self) -> dict[str, Any]:
        """Return the fields by name."""
        return asdict(self)


def fit_three_parameters(record: ArrayLike, frequency: float) -> SineFit:
    """Fit amplitude, phase and offset of a sine of known frequency to a record (n,).

    The linear least-squares solution of A cos + B sin + C. frequency: cycles per sample.
    Raises ValueError for fewer than 4 samples and for a frequency at which the three cannot be told apart.
    Source: IEEE Std 1057-2017 and 1241-2010, three-parameter sine fit (memory).

    >>> fit = fit_three_parameters(2.0 + np.cos(0.5 * np.arange(50) + 0.3), 0.5 / (2 * np.pi))
    >>> print(f"{fit.amplitude:.6f} {fit.phase:.6f} {fit.offset:.6f}")
    1.000000 0.300000 2.000000
    """
    samples = _samples(record, 4)
    solution, _ = _solve(samples, frequency)
    return _result(samples, frequency, solution)


def fit_four_parameters(record: ArrayLike, start: float | None = None) -> SineFit:
    """Fit amplitude, phase, offset and frequency of a sine to a record (n,).

    Gauss-Newton on the frequency, the other three solved along with each step. start: cycles per sample, within about
    half a cycle per record of the truth; None takes it from the windowed spectrum, which needs 128 samples and a sine
    clear of dc and half the sample rate.
    Raises ValueError for a start that leads nowhere.
    Source: IEEE Std 1057-2017 and 1241-2010, four-parameter sine fit (memory).

    >>> fit = fit_four_parameters(3 * np.cos(0.7 * np.arange(200) - 1))
    >>> print(f"{2 * np.pi * fit.frequency:.9f} {fit.amplitude:.9f}")
    0.700000000 3.000000000
    """
    samples = _samples(record, 5)
    frequency = windowed_metrics(samples).frequency if start is None else start
    first = frequency
    for _ in range(_STEPS):
        solution, step = _solve(samples, frequency, with_frequency=True)
        frequency += step
        if abs(frequency - first) * samples.size > 1.0:
            break
        if abs(step) * samples.size < 1e-10:
            solution, _ = _solve(samples, frequency)
            return _result(samples, frequency, solution)
    raise ValueError(
        f"no sine was found within one cycle per record of {first:.6g} cycles per sample"
    )


def effective_bits(residual_rms: float, full_scale: float) -> float:
    """Effective bits from the rms of what a sine fit leaves: log2(full_scale / (sqrt(12) residual_rms)).

    Both in the same unit, full_scale being the converter's whole range; it equals the effective bits from SNDR where
    the sine fills that range. Raises ValueError for values that are not positive.
    Source: IEEE Std 1241-2010, effective number of bits (memory).

    >>> effective_bits(1 / math.sqrt(12), 2**8)
    8.0
    """
    if not (residual_rms > 0 and full_scale > 0):
        raise ValueError("the residual and the full scale must be above zero")
    return math.log2(full_scale / (math.sqrt(12.0) * residual_rms))


def _samples(record: ArrayLike, fewest: int) -> NDArray[np.float64]:
    samples = np.asarray(record, dtype=np.float64)
    if samples.ndim != 1 or samples.size < fewest:
        raise ValueError(f"a record of {fewest} samples or more is needed")
    return samples


def _solve(
    samples: NDArray[np.float64], frequency: float, with_frequency: bool = False
) -> tuple[NDArray[np.float64], float]:
    """Solve for A, B and C, and for a small change of the frequency if asked."""
    phase = 2.0 * math.pi * frequency * np.arange(samples.size)
    columns = [np.cos(phase), np.sin(phase), np.ones_like(phase)]
    if with_frequency:
        (cosine, sine, _), _ = _solve(samples, frequency)
        # Time from the middle of the record, in records: keeps this column apart from the others, and of their size.
        time = (np.arange(samples.size) - (samples.size - 1) / 2) / samples.size
        columns.append(time * (sine * columns[0] - cosine * columns[1]))
    solution, _, rank, _ = np.linalg.lstsq(np.stack(columns, axis=1), samples)
    if rank < len(columns):
        raise ValueError(
            f"no sine of {frequency:.6g} cycles per sample can be told from the rest of this record"
        )
    step = solution[3] / (2.0 * math.pi * samples.size) if with_frequency else 0.0
    return solution[:3], float(step)


def _result(
    samples: NDArray[np.float64], frequency: float, solution: NDArray[np.float64]
) -> SineFit:
    cosine, sine, offset = (float(value) for value in solution)
    phase = 2.0 * math.pi * frequency * np.arange(samples.size)
    rest = samples - (cosine * np.cos(phase) + sine * np.sin(phase) + offset)
    return SineFit(
        amplitude=math.hypot(cosine, sine),
        frequency=frequency,
        phase=math.atan2(-sine, cosine),
        offset=offset,
        residual_rms=float(np.sqrt(np.mean(rest**2))),
    )
