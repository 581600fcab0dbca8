"""Which errors best explain a captured sine: offset, bow, noise, jitter, hysteresis and skew, each with an interval."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.stats import chi2, norm, t

from flashplan.measure.crossings import Crossings

Floats = NDArray[np.float64]

_CONFIDENCE = 0.95
_TAIL = (1 - _CONFIDENCE) / 2


@dataclass(frozen=True)
class Finding:
    """An estimate with its 95 % interval, in SI, and against the budget line of its name where there is one.

    met: True or False where the whole interval lies on one side of `limit`, else None.
    """

    value: float
    low: float
    high: float
    unit: str
    limit: float | None = None
    met: bool | None = None

    def to_dict(self) -> dict[str, Any]:
        """The finding as plain JSON types."""
        return {
            "value": self.value,
            "low": self.low,
            "high": self.high,
            "unit": self.unit,
            "limit": self.limit,
            "met": self.met,
        }


def diagnose(crossings: Crossings, slew: Floats, lsb: float) -> dict[str, Finding]:
    """Explain the thresholds of a capture.

    crossings: from `find_crossings`; slew: (M,) magnitude of the input's slope at each threshold in LSB/s; lsb in V.
    An error that the record cannot tell is left out. The offset's spread includes resistor mismatch, and noise and
    jitter are told apart only by how they grow with the slope.
    Source: error propagation and chi-square intervals of normal samples; common practice.
    """
    found: dict[str, Finding] = {}
    hysteresis = _hysteresis(crossings)
    if hysteresis is not None:
        found["hysteresis"] = _scaled(hysteresis, lsb, "V")
    found |= {name: _scaled(f, lsb, "V") for name, f in _offset_and_bow(crossings).items()}
    skew = _skew(crossings, slew)
    if skew is not None:
        found["skew_sigma"] = Finding(*skew, "s")
    for name, estimate in _noise_and_jitter(crossings, slew).items():
        if name == "noise_sigma":
            found[name] = _scaled(estimate, lsb, "V")
        else:
            found[name] = Finding(*estimate, "s")
    return found


Estimate = tuple[float, float, float]


def _scaled(estimate: Estimate, scale: float, unit: str) -> Finding:
    value, low, high = (part * scale for part in estimate)
    return Finding(value, low, high, unit)


def _hysteresis(crossings: Crossings) -> Estimate | None:
    """Twice the mean memory: where memory and direction go together, skew scatters it but does not shift it."""
    known = np.isfinite(crossings.memory)
    if np.count_nonzero(known) < 3:
        return None
    error = crossings.memory_error[known]
    spread = max(crossings.memory[known].std(ddof=1) ** 2 - float(np.mean(error**2)), 0.0)
    weight = 1.0 / (error**2 + spread)
    mean = 2 * float(np.average(crossings.memory[known], weights=weight))
    half = 2 * t.ppf(1 - _TAIL, error.size - 1) / float(np.sqrt(weight.sum()))
    return max(mean, 0.0), max(mean - half, 0.0), max(mean + half, 0.0)


def _offset_and_bow(crossings: Crossings) -> dict[str, Estimate]:
    """Spread of the thresholds about a line with a bow, and the bow at the middle."""
    known = np.isfinite(crossings.position)
    if np.count_nonzero(known) < 5:
        return {}
    count = known.size
    x = (np.arange(count) + 1.0)[known] / (count + 1)
    basis = np.stack([np.ones_like(x), x, 4 * x * (1 - x)], axis=1)
    solution, *_ = np.linalg.lstsq(basis, crossings.position[known], rcond=None)
    rest = crossings.position[known] - basis @ solution
    freedom = rest.size - 3
    measured = float(np.mean(crossings.position_error[known] ** 2))
    variance = float(rest @ rest) / freedom
    bow = float(solution[2])
    half = t.ppf(1 - _TAIL, freedom) * float(np.sqrt(variance * np.linalg.inv(basis.T @ basis)[2, 2]))
    return {"offset_sigma": _spread(variance, freedom, measured), "ladder_bow": (bow, bow - half, bow + half)}


def _spread(variance: float, freedom: float, measured: float) -> Estimate:
    """Sigma behind a sample variance that holds `measured` of measurement error, with its chi-square interval."""
    bounds = (variance, variance * freedom / chi2.ppf(1 - _TAIL, freedom), variance * freedom / chi2.ppf(_TAIL, freedom))
    value, low, high = (float(np.sqrt(max(bound - measured, 0.0))) for bound in bounds)
    return value, low, high


def _skew(crossings: Crossings, slew: Floats) -> Estimate | None:
    """Spread of each comparator's sampling instant, from how far the slope moves its threshold."""
    moved = np.where(crossings.together, -crossings.memory, crossings.lead)
    error = np.where(crossings.together, crossings.memory_error, crossings.lead_error)
    known = np.isfinite(moved) & (slew > 0.2 * slew.max())
    if np.count_nonzero(known) < 4:
        return None
    lever = slew[known]
    weight = lever**2
    instant = moved[known] / lever
    # What all thresholds share is hysteresis or the clock itself, not skew of one against the mean.
    shared = np.average(np.where(crossings.together[known], moved[known], 0.0))
    instant = (moved[known] - np.where(crossings.together[known], shared, 0.0)) / lever
    instant = instant - np.average(instant, weights=weight)
    freedom = (float(weight.sum()) ** 2) / float((weight**2).sum()) - 1
    variance = float(np.average(instant**2, weights=weight)) * (1 + 1 / freedom)
    measured = float(np.average((error[known] / lever) ** 2, weights=weight))
    return _spread(variance, freedom, measured)


def _noise_and_jitter(crossings: Crossings, slew: Floats) -> dict[str, Estimate]:
    """Weighted line through the noise's square against the slope's square: noise at no slope, jitter as its steepness."""
    known = np.isfinite(crossings.noise)
    if np.count_nonzero(known) < 4:
        return {}
    square = crossings.noise[known] ** 2
    # The relative error of each is like the mean one; its own would favour those that are low by luck.
    relative = crossings.noise_error[known] / crossings.noise[known]
    error = 2 * float(np.mean(square)) * relative
    basis = np.stack([np.ones_like(square), slew[known] ** 2 / slew.max() ** 2], axis=1) / error[:, None]
    covariance = np.linalg.inv(basis.T @ basis)
    solution = covariance @ basis.T @ (square / error)
    rest = square / error - basis @ solution
    covariance *= max(1.0, float(rest @ rest) / max(1, square.size - 2))
    reach = norm.ppf(1 - _TAIL)
    found: dict[str, Estimate] = {}
    for place, (name, scale) in enumerate((("noise_sigma", 1.0), ("jitter_sigma", 1.0 / slew.max()))):
        middle, half = float(solution[place]), reach * float(np.sqrt(covariance[place, place]))
        value, low, high = (scale * float(np.sqrt(max(v, 0.0))) for v in (middle, middle - half, middle + half))
        found[name] = (value, low, high)
    return found
