"""Intermodulation of two coherent tones."""

from dataclasses import asdict, dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from flashplan.metrics.spectrum import folded_bin, power_spectrum


@dataclass(frozen=True, slots=True)
class TwoToneMetrics:
    """Powers of two tones and of what they make of each other.

    `imd2_db` and `imd3_db`: the largest second-order (f2 - f1, f2 + f1) and third-order (2 f1 - f2, 2 f2 - f1,
    2 f1 + f2, 2 f2 + f1) product against the mean power of one tone. `sndr_db`: both tones against all the rest.
    """

    first_power: float
    second_power: float
    imd2_db: float
    imd3_db: float
    sndr_db: float

    def to_dict(self) -> dict[str, Any]:
        """Return the fields by name."""
        return asdict(self)


def two_tone_metrics(
    record: ArrayLike, first_cycles: int, second_cycles: int
) -> TwoToneMetrics:
    """Measure a record (n,) of two tones with whole numbers of cycles in it.

    Raises ValueError when the tones or their products up to the third order fall on each other, on dc or on half the
    sample rate, and when a tone is missing. Source: IEEE Std 1241-2010, two-tone intermodulation (memory).

    >>> x = np.arange(1024) * 2 * np.pi / 1024
    >>> record = np.cos(101 * x) + np.cos(127 * x) + 0.01 * np.cos(75 * x)   # 75 = 2 * 101 - 127
    >>> print(f"{two_tone_metrics(record, 101, 127).imd3_db:.2f}")
    -40.00
    """
    samples = np.asarray(record, dtype=np.float64)
    one, two, length = first_cycles, second_cycles, samples.size
    tones = [folded_bin(one, length), folded_bin(two, length)]
    second_order = [folded_bin(two - one, length), folded_bin(two + one, length)]
    third_order = [
        folded_bin(cycles, length)
        for cycles in (2 * one - two, 2 * two - one, 2 * one + two, 2 * two + one)
    ]
    taken = [0, *tones, *second_order, *third_order]
    if len(set(taken)) < len(taken) or length in [2 * place for place in taken]:
        raise ValueError(
            f"with {one} and {two} cycles in {length} samples two of dc, the tones and their products share a bin"
        )
    power = power_spectrum(samples)
    if not np.all(power[tones] > 0):
        raise ValueError("one of the two tones is missing")
    tone = power[tones].mean()
    rest = power.sum() - power[0] - power[tones].sum()
    with np.errstate(divide="ignore"):  # no product at all
        return TwoToneMetrics(
            first_power=float(power[tones[0]]),
            second_power=float(power[tones[1]]),
            imd2_db=float(10 * np.log10(power[second_order].max() / tone)),
            imd3_db=float(10 * np.log10(power[third_order].max() / tone)),
            sndr_db=float(-10 * np.log10(max(rest, 0.0) / (2 * tone))),
        )
