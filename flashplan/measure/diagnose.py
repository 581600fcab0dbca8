"""Which errors best explain a captured sine: offset, bow, noise, jitter, hysteresis and skew, each with an interval."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.stats import t

from flashplan.measure.crossings import NearDecisions, expand, near_decisions
from flashplan.measure.effects import SHARED, fit_effects, judge_effects, shared_design
from flashplan.measure.interval import Profile, profile_interval
from flashplan.measure.scatter import fit_scatter, scatter, scatter_likelihood

Floats = NDArray[np.float64]

_CONFIDENCE = 0.95
_ROUNDS = 40
# Neighbours one LSB apart pass each other in one of 75 pairs at this scatter of their gap.
_MOST_GAP_LSB = 0.45
_FEWEST = 5  # comparators, without which nothing can be said of how they differ


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


def diagnose(
    value: Floats,
    slope: Floats,
    decisions: NDArray[np.bool_],
    lsb: float,
    rebuilt: bool = False,
) -> dict[str, Finding]:
    """Explain the decisions of a record whose input is known up to gain, offset and delay.

    value: (n,) input in LSB; slope: (n,) in LSB/s; decisions: (n, M) bool, lowest threshold first, in the order taken;
    lsb in V; rebuilt: the decisions come from codes, that is in order of size. Empty where fewer than five thresholds
    were reached, and where rebuilt decisions so often stand for another comparator's that they would mislead.

    The offset's spread is about a line with a bow and includes resistor mismatch. Noise and jitter are told apart by how
    they grow with the slope, hysteresis and skew by what each comparator last decided; an interval starts at zero, and
    is wide, where the record does not tell.
    """
    near = near_decisions(value, slope, decisions)
    if near.position.size < _FEWEST:
        return {}
    shared, spreads, scatters, gaps = _explain(near, decisions.shape[1])
    # Noise of its own moves each comparator, jitter moves all together.
    if rebuilt and np.hypot(gaps, np.sqrt(2) * scatters[0].value) > _MOST_GAP_LSB:
        return {}
    steepest = float(np.abs(slope).max())
    volts = {
        "offset_sigma": spreads[0],
        "noise_sigma": scatters[0],
        "hysteresis": _at_least_zero(_twice(shared["memory"])),
        "ladder_bow": shared["bow"],
    }
    seconds = {"skew_sigma": spreads[1], "jitter_sigma": scatters[1]}
    return {name: _finding(p, lsb, "V") for name, p in volts.items()} | {
        name: _finding(p, 1 / steepest, "s") for name, p in seconds.items()
    }


def _finding(profile: Profile, scale: float, unit: str) -> Finding:
    value, low, high = (part * scale for part in profile)
    return Finding(value, low, high, unit)


def _explain(
    near: NearDecisions, comparators: int
) -> tuple[dict[str, Profile], list[Profile], list[Profile], float]:
    """Shared effects by name, spreads (offset, skew) and scatters (noise, jitter), in LSB at the largest slope; last how
    far the gaps between neighbours' trip points scatter under a rising or a falling input, whichever is more."""
    design = shared_design((near.index + 1) / (comparators + 1))
    own = np.stack([near.position, *np.zeros((2, near.position.size))], axis=1)
    spreads = np.array([0.3, 0.1])
    # Too much scatter makes the first steps short and safe.
    sigma = np.array([max(near.doubt / 2, near.spacing), 0.05 * near.doubt])
    floor = 0.7 * near.spacing
    slope_square = near.slope**2
    for _ in range(_ROUNDS):
        before = np.concatenate([own.ravel(), sigma])
        found = expand(near, own, scatter(sigma, slope_square, floor))
        precision = found.information[:, :3, :3]
        linear = found.score[:, :3] + (precision @ own[:, :, None])[:, :, 0]
        spreads, own, rank = fit_effects(design, linear, precision, spreads)
        # What each comparator spends on its own threshold and lead makes the scatter look too small.
        spent = 0.5 * (rank + len(SHARED) / rank.size)
        likelihood = scatter_likelihood(
            sigma,
            found.steepness,
            floor,
            found.score[:, 3] + spent,
            found.information[:, 3, 3],
        )
        sigma = fit_scatter(likelihood, sigma)
        change = np.abs(np.concatenate([own.ravel(), sigma]) - before)
        if change.max() < 2e-3 * float(np.hypot(*sigma)) + 1e-2 * floor:
            break
    freedom = max(1, near.index.size - 3)
    reach = float(t.ppf((1 + _CONFIDENCE) / 2, freedom))
    effects = judge_effects(design, linear, precision, spreads, reach**2 / 2)
    half = reach * np.sqrt(np.diag(effects.covariance))
    shared = {
        name: Profile(float(b), float(b - h), float(b + h))
        for name, b, h in zip(SHARED, effects.shared, half, strict=True)
    }
    size = float(np.hypot(*sigma)) + floor
    scatters = [
        profile_interval(likelihood, sigma, which, 1.96**2 / 2, scale=size)
        for which in (0, 1)
    ]
    lead = own[:, 2] * np.sqrt(found.steepness)
    gaps = max(float(np.diff(own[:, 0] + way * lead).std()) for way in (-1, 1))
    return shared, [effects.offset, effects.skew], scatters, gaps


def _twice(profile: Profile) -> Profile:
    return Profile(*(2 * part for part in profile))


def _at_least_zero(profile: Profile) -> Profile:
    return Profile(*(max(part, 0.0) for part in profile))
