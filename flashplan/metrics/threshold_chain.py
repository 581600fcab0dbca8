"""The chain of thresholds: what is lost and what survives, stepped down from the last threshold to the first."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.band_operator import Panels, band_matrix, make_panels
from flashplan.metrics.offset_density import OffsetDensity
from flashplan.metrics.resistor_bridge import Bridge

# Kinks of the iterates soften by one derivative per step; deeper ones than this are below the quadrature's error.
_KINK_DEPTH = 9


@dataclass(frozen=True, slots=True)
class Band:
    """The two goals on one set of panels: |u| < half (the INL goal, or where the density ends), |step| < dnl.

    half, dnl in LSB; dnl may be infinite.
    """

    panels: Panels
    half: float
    dnl: float

    def limits(self, at: NDArray, room: float = np.inf) -> tuple[NDArray, NDArray]:
        """Lowest and highest next value that passes from each value in `at`, itself within +-room."""
        top = min(self.half, room)
        return np.maximum(at - self.dnl, -top), np.minimum(at + self.dnl, top)


def make_band(
    half: float,
    dnl: float,
    density: OffsetDensity,
    hard: Sequence[float] = (),
    refine: int = 0,
) -> Band:
    """Lay panels with breaks where the iterates have kinks: a whole number of DNL bands from each hard edge.

    half: where the domain ends, in LSB; hard: where the integrand itself jumps or has a kink, beside +-half.
    """
    breaks = [
        edge + sign * steps * dnl
        for edge in (half, *hard)
        for steps in range(_KINK_DEPTH if np.isfinite(dnl) else 1)
        for sign in ((1, -1) if np.isfinite(dnl) else (1,))
    ]
    return Band(make_panels(half, breaks, density.width, refine), half, dnl)


def homogeneous_chain(
    band: Band, density: OffsetDensity, steps: int
) -> tuple[float, float]:
    """Return loss and survival of a first threshold followed by `steps` more, all alike, none fitted away.

    loss q(x) = c(x) + int_band(x) f(y) q(y) dy and survival s(x) = int_band(x) f(y) s(y) dy, applied `steps` times by
    doubling, S_2n = S_n + A^n S_n, so the cost grows with the logarithm of `steps`. No difference of near-equal
    numbers is taken, so both keep their relative accuracy however small.
    """
    x = band.panels.nodes
    lower, upper = band.limits(x)
    operator = band_matrix(band.panels, lower, upper) * density.pdf(x)
    fails = density.cdf(lower) + density.sf(upper)
    start = band.panels.weights * density.pdf(x)
    outside = density.cdf(-band.half) + density.sf(band.half)
    if density.symmetric:  # both iterates are even: keep one half of the nodes
        keep = len(x) // 2 + len(x) % 2
        operator, fails, start = _fold(operator[:keep]), fails[:keep], _fold(start)
    loss, survive = np.zeros(len(fails)), np.ones(len(fails))
    while steps:
        if steps % 2:
            loss, survive = fails + operator @ loss, operator @ survive
        steps //= 2
        if steps:
            fails = fails + operator @ fails
            operator = operator @ operator
    return float(outside + start @ loss), float(start @ survive)


def _fold(matrix: NDArray) -> NDArray:
    """Add the mirrored columns, for a function that is even on symmetric nodes."""
    half = matrix.shape[-1] // 2
    folded = matrix[..., : matrix.shape[-1] - half].copy()
    folded[..., :half] += matrix[..., ::-1][..., :half]
    return folded


@dataclass(frozen=True, slots=True)
class Stretch:
    """What moves the thresholds of a chain apart from their own offsets, for several columns of a batch at once.

    Threshold i of `count` passes where its offset is gain * u + shift_i - (its bridge tap) with |u| inside the band.
    shift (count, columns) and gain (columns,) in LSB and LSB per LSB; complex shifts continue the density. first_tap:
    the bridge tap of the first threshold. tied: the chain starts and ends at u = 0 (at thresholds outside `count`).
    """

    shift: NDArray
    gain: NDArray[np.float64]
    bridge: Bridge
    first_tap: int
    tied: bool


def stepped_chain(
    band: Band, density: OffsetDensity, stretch: Stretch
) -> tuple[NDArray, NDArray]:
    """Return loss and survival, each (columns,), of a chain whose weights differ from threshold to threshold.

    The state is (u, z): the value of the last threshold and the normalised position of the resistor string. Cost:
    count n^2 columns modes, with n the panels' nodes.
    """
    count, columns = stretch.shift.shape
    x, bridge, gain = band.panels.nodes, stretch.bridge, stretch.gain[:, np.newaxis]
    room = band.dnl if stretch.tied else np.inf
    modes = len(bridge.nodes)
    kind = np.result_type(stretch.shift, float)
    loss = np.zeros((len(x), columns, modes), kind)
    survive = np.ones((len(x), columns, modes), kind)
    between = band_matrix(band.panels, *band.limits(x))
    for i in range(count - 1, -1, -1):
        at = x if i else np.zeros(1)
        lower, upper = band.limits(at, room if i == count - 1 else np.inf)
        if i == 0 and not stretch.tied:
            lower, upper = np.array([-band.half]), np.array([band.half])
        if 0 < i < count - 1:
            integrate = between
        else:
            integrate = band_matrix(band.panels, lower, upper)
        tap = stretch.first_tap + i
        moved = stretch.shift[i][:, np.newaxis] - bridge.deviation(tap) * bridge.nodes
        weight = gain * density.pdf(gain * x[:, np.newaxis, np.newaxis] + moved)
        fails = density.cdf(gain * lower[:, np.newaxis, np.newaxis] + moved)
        fails += density.sf(gain * upper[:, np.newaxis, np.newaxis] + moved)
        loss = fails + _apply(integrate, weight * loss)
        survive = _apply(integrate, weight * survive)
        if i and modes > 1:
            expect = bridge.expectation(tap - 1).T
            loss, survive = loss @ expect, survive @ expect
    return loss[0] @ bridge.weights, survive[0] @ bridge.weights


def _apply(matrix: NDArray, values: NDArray) -> NDArray:
    flat = matrix @ values.reshape(len(values), -1)
    return flat.reshape(len(matrix), *values.shape[1:])
