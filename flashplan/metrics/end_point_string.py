"""The end-point line on a string with resistor mismatch: the first offset starts the path that the string takes.

The string between the outer taps is a pinned string of its own. Added to the line from the first offset x to the last
offset y it is a path that starts at a random x and ends at y, so one chain for each y covers all x. The fitted LSB
depends on both offsets and on the outer taps, so the chain is worked out for a few LSB and interpolated.
"""

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.band_operator import make_panels
from flashplan.metrics.gaussian_path import hermite_rule, loose_path, modes_needed
from flashplan.metrics.long_chain import (
    extrapolate,
    hazard,
    hazard_per_threshold,
    may_squeeze,
    resample,
)
from flashplan.metrics.offset_density import NormalOffsets, OffsetDensity
from flashplan.metrics.threshold_chain import Stretch, make_band, stepped_chain

Array = NDArray[np.float64]


def string_yield(
    density: OffsetDensity,
    dnl: float,
    inl: float,
    resistor_sigma: float,
    bow: Array,
    mean_gain: float,
    points: Array,
    chances: Array,
    refine: int = 0,
) -> tuple[float, float]:
    """Return loss and yield.

    bow: what the inner thresholds are off the end-point line by systematic errors, in LSB (2**bits - 3,); mean_gain:
    that line's LSB; points, chances: rule for the last offset. The rest as linearity_yield's.
    """
    steps = len(bow) + 1
    start = density.width if isinstance(density, NormalOffsets) else density.reach / 6
    spread = 0.5 * resistor_sigma * np.sqrt(steps)
    largest = np.sqrt(_peak(start**2, 4 * spread**2))
    modes = modes_needed(largest / density.width) + 8 * refine
    x, x_chances = _start_rule(density, start, modes)
    symmetric = density.symmetric and not bow.any() and mean_gain == 1.0
    if symmetric:
        chances = np.where(points > 0, 2.0, points == 0) * chances
        points, chances = points[chances > 0], chances[chances > 0]
    # the outer taps' own movement, as a part of the LSB: b_M - b_1 of a pinned string
    slack = resistor_sigma * np.sqrt(2.0 / (steps * (steps + 2.0)))
    wobble = np.hypot(slack, np.sqrt(2.0) * start / steps)
    gain_knots = np.sqrt(3.0) * (np.array([-1, 0, 1]) if steps > 14 else np.linspace(-1.5, 1.5, 5))
    y, gain = (
        v.ravel()
        for v in np.meshgrid(points, mean_gain + wobble * gain_knots, indexing="ij")
    )
    reach = max(np.abs(points).max(), np.abs(x[x_chances > 1e-12]).max())
    farthest = reach + 6 * spread + np.abs(bow).max()
    half = min(inl, density.reach + farthest)
    band = make_band(half, dnl, density, (0.0,), 2.0 * (1 + 0.25 * refine))
    squeeze = may_squeeze(bow[:, np.newaxis], density.width)
    per_threshold = (
        hazard_per_threshold(band, density, gain, farthest) if squeeze else None
    )

    def chain(length: int) -> NDArray:
        each = steps / length
        taps = np.arange(1.0, length)
        path = loose_path(length, resistor_sigma * np.sqrt(each), start, taps, modes)
        shift = np.outer(taps / length, y) - resample(bow[:, np.newaxis], length)
        stretch = Stretch(shift, gain, path, tied=True)
        return hazard(*stepped_chain(band, density, stretch, per_threshold, each - 1))

    hazards = extrapolate(chain, steps, grows=False) if squeeze else chain(steps)
    log_hazards = np.log(np.maximum(hazards, 1e-300))
    log_hazards = log_hazards.reshape(len(points), len(gain_knots), len(x))
    tilt = (points[:, np.newaxis] - x) / (steps * wobble)
    weights = np.outer(chances, x_chances)
    loss = survive = 0.0
    for way in (1.0, -1.0) if symmetric else (1.0,):
        for move, share in zip((-1.0, 0.0, 1.0), (1 / 6, 2 / 3, 1 / 6), strict=True):
            at = way * tilt + move * np.sqrt(3.0) * slack / wobble
            rate = np.exp(np.minimum(_polynomial(gain_knots, log_hazards, at), 50.0))
            share = share / 2 if symmetric else share
            loss += share * float((weights * -np.expm1(-rate)).sum())
            survive += share * float((weights * np.exp(-rate)).sum())
    return loss, survive


def _peak(start: float, spread: float) -> float:
    """Largest of start (1 - t)^2 + spread t (1 - t) on 0 <= t <= 1."""
    if spread <= 2 * start:  # it falls from the start
        return start
    t = (spread - 2 * start) / (2 * (spread - start))
    return start * (1 - t) ** 2 + spread * t * (1 - t)


def _start_rule(density: OffsetDensity, start: float, modes: int) -> tuple[Array, Array]:
    """The path's nodes before the chain, in LSB, and the chance of each as the first offset."""
    nodes, weights, hermite = hermite_rule(modes)
    if isinstance(density, NormalOffsets):
        return start * nodes, weights
    # chances that integrate every Hermite mode exactly against the density
    panels = make_panels(density.reach, density.kinks, density.width, 2.8)
    below, mode = np.zeros(len(panels.nodes)), np.ones(len(panels.nodes))
    chance = panels.weights * density.pdf(panels.nodes)
    at = panels.nodes / start
    moments = np.empty(modes)
    for n in range(modes):
        moments[n] = chance @ mode
        above = (at * mode - np.sqrt(n) * below) / np.sqrt(n + 1.0)
        below, mode = mode, above
    chances = weights * (hermite @ moments)
    return start * nodes, np.where(np.abs(start * nodes) < density.reach, chances, 0.0)


def _polynomial(knots: Array, values: Array, at: Array) -> Array:
    """The polynomial through values (rows, knots, columns) at `at` (rows, columns)."""
    total = np.zeros_like(at)
    for i, knot in enumerate(knots):
        others = np.delete(knots, i)
        basis = np.prod([(at - o) / (knot - o) for o in others], axis=0)
        total += basis * values[:, i]
    return total
