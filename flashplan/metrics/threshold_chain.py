"""The chain of thresholds: what is lost and what survives, stepped down from the last threshold to the first."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.band_operator import Panels, band_matrix, make_panels
from flashplan.metrics.offset_density import OffsetDensity
from flashplan.metrics.gaussian_path import GaussianPath

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
    nodes_per_width: float = 2.8,
) -> Band:
    """Lay panels with breaks where the iterates have kinks: a whole number of DNL bands from each hard edge.

    half: where the domain ends, in LSB; hard: where the integrand itself jumps or has a kink, beside +-half.
    """
    hard_edges = (half, *hard) if half < density.reach else hard
    breaks = [
        edge + sign * steps * dnl
        for edge in hard_edges
        for steps in range(_KINK_DEPTH if np.isfinite(dnl) else 1)
        for sign in ((1, -1) if np.isfinite(dnl) else (1,))
    ]
    return Band(make_panels(half, breaks, density.width, nodes_per_width), half, dnl)


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

    Threshold i of `count` has the offset gain * u + shift_i + deviation_i z_i, and passes with |u| inside the band.
    shift (count, columns) in LSB, complex to continue the density analytically; gain (columns,); path: the movement
    that is averaged over. tied: the chain leaves from u = 0 and must end within one DNL band of u = 0.
    """

    shift: NDArray
    gain: NDArray[np.float64]
    path: GaussianPath
    tied: bool


Hazard = Callable[[NDArray, NDArray], NDArray]


def stepped_chain(
    band: Band,
    density: OffsetDensity,
    stretch: Stretch,
    hazard: Hazard | None = None,
    repeats: float = 0.0,
) -> tuple[NDArray, NDArray]:
    """Return loss and survival of a chain whose weights differ from threshold to threshold: both (columns, modes).

    The modes are the values at the nodes of the path's state before the chain. The state is (u, z): the value of the
    last threshold and the position of the path. Cost: count n (n + modes) columns modes, n the nodes of the panels.

    hazard, repeats: each step stands for this many thresholds beside its own, whose survival is exp(-hazard(moved,
    gain)) each, from the threshold's movement (columns, modes) and the gain (columns, 1); see long_chain.
    """
    count, columns = stretch.shift.shape
    x, path, gain = band.panels.nodes, stretch.path, stretch.gain[:, np.newaxis]
    modes = len(path.nodes)
    kind = np.result_type(stretch.shift, float)
    loss = np.zeros((len(x), columns, modes), kind)
    survive = np.ones((len(x), columns, modes), kind)
    between = _Step(band, *band.limits(x))
    for i in range(count - 1, -1, -1):
        moved = stretch.shift[i][:, np.newaxis] + path.deviation[i] * path.nodes
        step = between
        if i == 0 and not stretch.tied:
            step = _Step(band, np.array([-band.half]), np.array([band.half]))
        elif i in (0, count - 1) and stretch.tied:
            room = band.dnl if i == count - 1 else np.inf
            step = _Step(band, *band.limits(x if i else np.zeros(1), room))
        loss, survive = step.apply(loss, survive, density, gain, moved)
        if hazard is not None:
            more = repeats * hazard(moved, gain)
            kept = np.exp(-more)
            loss, survive = kept * loss - np.expm1(-more), kept * survive
        if modes > 1:
            expect = path.expectation(i).T
            loss, survive = loss @ expect, survive @ expect
    return loss[0], survive[0]


class _Step:
    """One threshold of the chain: the band integral and the tails outside, for one set of limits."""

    def __init__(self, band: Band, lower: NDArray, upper: NDArray) -> None:
        self.nodes = band.panels.nodes[:, np.newaxis, np.newaxis]
        self.integrate = band_matrix(band.panels, lower, upper)
        # half of the limits are the box itself: work out each tail once
        self.lower, self.which_lower = np.unique(lower, return_inverse=True)
        self.upper, self.which_upper = np.unique(upper, return_inverse=True)

    def apply(
        self,
        loss: NDArray,
        survive: NDArray,
        density: OffsetDensity,
        gain: NDArray,
        moved: NDArray,
    ) -> tuple[NDArray, NDArray]:
        weight = gain * density.pdf(gain * self.nodes + moved)
        below = density.cdf(gain * self.lower[:, np.newaxis, np.newaxis] + moved)
        above = density.sf(gain * self.upper[:, np.newaxis, np.newaxis] + moved)
        lost = self._band(weight * loss)
        lost += below[self.which_lower]
        lost += above[self.which_upper]
        weight *= survive
        return lost, self._band(weight)

    def _band(self, values: NDArray) -> NDArray:
        flat = self.integrate @ values.reshape(len(values), -1)
        return flat.reshape(-1, *values.shape[1:])
