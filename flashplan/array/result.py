"""What the simulation of an array says."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Interval:
    """A 95 % confidence interval."""

    low: float
    high: float


@dataclass(frozen=True)
class StaticResult:
    """Linearity over drawn arrays, and the exact yield beside the drawn one.

    max_dnl_lsb, max_inl_lsb: (arrays,) largest magnitude in each array. dnl_band_lsb, inl_band_lsb: rows are the
    percentiles `BANDS` over arrays at each code. systematic_lsb: (M,) fixed threshold errors of the ladder.
    """

    arrays: int
    passed: int
    yield_interval: Interval
    exact_yield: float
    max_dnl_lsb: Floats
    max_inl_lsb: Floats
    dnl_band_lsb: Floats
    inl_band_lsb: Floats
    systematic_lsb: Floats

    def to_dict(self) -> dict[str, Any]:
        """JSON of the static part."""
        return {
            "arrays": self.arrays,
            "yield": self.passed / self.arrays,
            "yield_low": self.yield_interval.low,
            "yield_high": self.yield_interval.high,
            "exact_yield": self.exact_yield,
            "dnl_lsb": percentiles(self.max_dnl_lsb),
            "inl_lsb": percentiles(self.max_inl_lsb),
        }


BANDS = (1.0, 50.0, 99.0)
_PERCENTILES = (5, 50, 90, 95, 99)


def percentiles(values: Floats) -> dict[str, float]:
    """Percentiles over arrays, keyed "p50" and so on."""
    return {
        f"p{p}": float(v)
        for p, v in zip(_PERCENTILES, np.percentile(values, _PERCENTILES), strict=True)
    }


@dataclass(frozen=True)
class DynamicResult:
    """A coherent sine converted by several drawn arrays.

    error_power_lsb2: of each array; enob from their mean, enob_low what the plan's yield of arrays reaches;
    spectrum_db: (samples/2 + 1,) mean power spectrum against the signal; words, reference: thermometer words that
    have a bubble, with the count of ones of each.
    """

    arrays: int
    samples: int
    frequency: float
    cycles: int
    sndr_db: float
    sfdr_db: float
    enob: float
    enob_interval: Interval
    enob_low: float
    enob_low_interval: Interval
    error_power_lsb2: Floats
    bubble_rate: float
    bubble_rate_interval: Interval
    bubbles_by_order: dict[int, int]
    spectrum_db: Floats
    bubbly_words: NDArray[np.bool_]
    clean_counts: NDArray[np.int64]

    def to_dict(self) -> dict[str, Any]:
        """JSON of the dynamic part."""
        return {
            "arrays": self.arrays,
            "samples": self.samples,
            "input_frequency": self.frequency,
            "cycles": self.cycles,
            "sndr_db": self.sndr_db,
            "sfdr_db": self.sfdr_db,
            "enob": self.enob,
            "enob_interval": [self.enob_interval.low, self.enob_interval.high],
            "enob_low": self.enob_low,
            "enob_low_interval": [
                self.enob_low_interval.low,
                self.enob_low_interval.high,
            ],
            "bubble_rate": self.bubble_rate,
            "bubble_rate_interval": [
                self.bubble_rate_interval.low,
                self.bubble_rate_interval.high,
            ],
            "bubbles_by_order": {
                str(order): count
                for order, count in sorted(self.bubbles_by_order.items())
            },
        }


@dataclass(frozen=True)
class ArrayResult:
    """The whole array against the plan's goals.

    static, dynamic, word_error_rate: None where the datasheet does not give what they need. left_out: keys that the
    datasheet does not give and whose effect is therefore missing; goals_met: None where that leaves a goal open.
    """

    static: StaticResult | None
    dynamic: DynamicResult | None
    word_error_rate: float | None
    power: dict[str, float | None]
    goals_met: dict[str, bool | None]
    left_out: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `array`."""
        return {
            "static": None if self.static is None else self.static.to_dict(),
            "dynamic": None if self.dynamic is None else self.dynamic.to_dict(),
            "word_error_rate": self.word_error_rate,
            "power": dict(self.power),
            "goals_met": dict(self.goals_met),
            "left_out": list(self.left_out),
        }
