"""Decision delay against overdrive, and the regeneration that its exponential part shows."""

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from flashplan.cell.bench.setup import Setup, decide, reset_state

Floats = NDArray[np.float64]

_SMALL = 1e-6  # V, the overdrive whose regeneration lasts long enough to be fitted
_WINDOW = (
    2e-3,
    5e-2,
)  # part of the supply between which the output grows exponentially
_VALID = 0.55  # part of the supply, just beyond the valid level, at which a run may end
_START = 0.1  # regeneration has started once the output keeps within this part of the exponential


@dataclass(frozen=True)
class DelayCurve:
    """overdrive V and delay s from the clock's mid-edge to a valid output, (points,); NaN where it is not reached."""

    overdrive: Floats
    delay: Floats
    failed: int

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON types; None where no valid output was reached."""
        return {
            "overdrive": self.overdrive.tolist(),
            "delay": [float(d) if np.isfinite(d) else None for d in self.delay],
            "failed": self.failed,
        }


@dataclass(frozen=True)
class Regeneration:
    """v(t) = gain v_in exp((t - delay) / tau): tau and delay in s, with the interval of tau (two standard errors)."""

    tau: float
    tau_low: float
    tau_high: float
    gain: float
    delay: float


def delay_curve(setup: Setup, overdrive: ArrayLike, time: float) -> DelayCurve:
    """Delay to a valid output at each overdrive in V; time: longest delay to wait for, s."""
    given = np.atleast_1d(np.asarray(overdrive, dtype=float))
    start = np.repeat(reset_state(setup, setup.network.parameters, 1), given.size, 1)
    decision = decide(
        setup, setup.network.parameters, start, given, time=time, until=_VALID
    )
    crossing = np.array(
        [
            first_crossing(decision.time, decision.output[:, k], setup.valid_level)
            for k in range(given.size)
        ]
    )
    return DelayCurve(given, crossing, int(decision.trajectory.failed.sum()))


def measure_regeneration(setup: Setup, time: float) -> Regeneration:
    """Regeneration constant, gain and delay from one decision of 1 uV; time: longest to wait for it, s.

    tau: fit of ln(output) between 0.2 % and 5 % of the supply. delay: from where on the output stays within 10 % of
    that exponential. gain: such that the law gives the measured instant of the valid level, which is what the rate of
    undecided comparators hangs on. Raises ValueError when the output does not get there in time.
    """
    precise = replace(setup, tolerance=min(setup.tolerance, 1e-5))
    start = reset_state(precise, setup.network.parameters, 1)
    decision = decide(
        precise, setup.network.parameters, start, _SMALL, time=time, until=_VALID
    )
    output, when = decision.output[:, 0], decision.time
    valid = first_crossing(when, output, setup.valid_level)
    low, high = (part * setup.network.supply for part in _WINDOW)
    inside = (output > low) & (output < high) & (when < valid)
    if not np.isfinite(valid) or inside.sum() < 3:
        raise ValueError("the cell does not regenerate a 1 uV input in the time given")
    x, y = when[inside], np.log(output[inside])
    (rate, height), residual = np.polyfit(x, y, 1), 0.0
    residual = float(np.sqrt(np.mean((y - rate * x - height) ** 2)))
    error = residual / (np.std(x) * np.sqrt(max(x.size - 2, 1)))
    before = (when <= x[0]) & (when > -setup.lead)
    ratio = np.abs(output[before]) / np.exp(rate * when[before] + height)
    off = np.flatnonzero(np.abs(ratio - 1.0) > _START)
    begins = (
        when[before][off[-1] + 1] if off.size and off[-1] + 1 < ratio.size else x[0]
    )
    tau = 1.0 / rate
    return Regeneration(
        tau=float(tau),
        tau_low=float(1.0 / (rate + 2.0 * error)),
        tau_high=float(1.0 / max(rate - 2.0 * error, 1e-3 * rate)),
        gain=float(setup.valid_level / _SMALL * np.exp(-(valid - begins) / tau)),
        delay=float(begins),
    )


def first_crossing(time: Floats, values: Floats, level: float) -> float:
    """First time at which |values| reaches a level, interpolated in the logarithm; NaN if it never does."""
    size = np.abs(values)
    reached = np.flatnonzero(size >= level)
    if not reached.size or reached[0] == 0:
        return float("nan")
    k = int(reached[0])
    if size[k - 1] <= 0:
        return float(time[k])
    part = np.log(level / size[k - 1]) / np.log(size[k] / size[k - 1])
    return float(time[k - 1] + part * (time[k] - time[k - 1]))
