"""The chain of thresholds: what is lost and what survives, stepped down from the last threshold to the first."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.band_operator import Panels, band_matrix, make_panels
from flashplan.metrics.gaussian_path import GaussianPath
from flashplan.metrics.offset_density import OffsetDensity

# Kinks of the iterates soften by one derivative per step; deeper ones than this are below the quadrature's error.
_KINK_DEPTH = 9


@dataclass(frozen=True, slots=True)
class Step:
    """One threshold's limits: integrate (rows, n) is the band integral between them; each tail once, and who uses it."""

    integrate: NDArray
    lower: NDArray
    which_lower: NDArray
    upper: NDArray
    which_upper: NDArray


@dataclass(frozen=True, slots=True)
class Band:
    """The two goals on one set of panels: |u| < half (the INL goal, or where the density ends), |step| < dnl.

    half, dnl in LSB; dnl may be infinite. between: the step from one threshold to the next.
    """

    panels: Panels
    half: float
    dnl: float
    between: Step


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
    depth = _KINK_DEPTH if np.isfinite(dnl) else 1
    breaks = [
        edge + sign * steps * dnl if steps else edge
        for edge in hard_edges
        for steps in range(depth)
        for sign in (1, -1)
    ]
    panels = make_panels(half, breaks, density.width, nodes_per_width)
    between = _make_step(panels, *_limits(panels.nodes, half, dnl))
    return Band(panels, half, dnl, between)


def _limits(at: NDArray, half: float, dnl: float) -> tuple[NDArray, NDArray]:
    """Lowest and highest next value that passes from each value in `at`."""
    return np.maximum(at - dnl, -half), np.minimum(at + dnl, half)


def _make_step(panels: Panels, lower: NDArray, upper: NDArray) -> Step:
    # half of the limits are the box itself: work out each tail once
    return Step(
        band_matrix(panels, lower, upper),
        *np.unique(lower, return_inverse=True),
        *np.unique(upper, return_inverse=True),
    )


def homogeneous_chain(
    band: Band, density: OffsetDensity, steps: int
) -> tuple[float, float]:
    """Return loss and survival of a first threshold followed by `steps` more, all alike, none fitted away.

    loss q(x) = c(x) + int_band(x) f(y) q(y) dy and survival s(x) = int_band(x) f(y) s(y) dy, applied `steps` times by
    doubling, S_2n = S_n + A^n S_n, so the cost grows with the logarithm of `steps`. No difference of near-equal
    numbers is taken, so both keep their relative accuracy however small.
    """
    x = band.panels.nodes
    step = band.between
    operator = step.integrate * density.pdf(x)
    fails = density.cdf(step.lower)[step.which_lower]
    fails += density.sf(step.upper)[step.which_upper]
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
    for i in range(count - 1, -1, -1):
        moved = stretch.shift[i][:, np.newaxis] + path.deviation[i] * path.nodes
        step = band.between
        if i == 0 or (stretch.tied and i == count - 1):
            step = _end_step(band, stretch.tied, i == 0, i == count - 1)
        loss, survive = _advance(loss, survive, band, step, density, gain, moved)
        if hazard is not None:
            more = repeats * hazard(moved, gain)
            kept = np.exp(-more)
            loss, survive = kept * loss - np.expm1(-more), kept * survive
        if modes > 1:
            expect = path.expectation(i).T
            loss, survive = loss @ expect, survive @ expect
    return loss[0], survive[0]


def _end_step(band: Band, tied: bool, first: bool, last: bool) -> Step:
    """The step onto the first threshold, from u = 0 if tied; onto the last, from which u = 0 must be in reach."""
    lower, upper = np.array([-band.half]), np.array([band.half])
    if tied:
        at = np.zeros(1) if first else band.panels.nodes
        lower, upper = _limits(at, band.half, band.dnl)
        if last:
            lower, upper = np.maximum(lower, -band.dnl), np.minimum(upper, band.dnl)
    return _make_step(band.panels, lower, upper)


def _advance(
    loss: NDArray,
    survive: NDArray,
    band: Band,
    step: Step,
    density: OffsetDensity,
    gain: NDArray,
    moved: NDArray,
) -> tuple[NDArray, NDArray]:
    """Loss and survival from one threshold on, from those of the next: (n, columns, modes) to (rows, columns, modes)."""

    def offset(u: NDArray) -> NDArray:
        return gain * u[:, np.newaxis, np.newaxis] + moved

    def integral(values: NDArray) -> NDArray:
        flat = step.integrate @ values.reshape(len(values), -1)
        return flat.reshape(-1, *values.shape[1:])

    weight = gain * density.pdf(offset(band.panels.nodes))
    lost = integral(weight * loss)
    lost += density.cdf(offset(step.lower))[step.which_lower]
    lost += density.sf(offset(step.upper))[step.which_upper]
    weight *= survive
    return lost, integral(weight)
