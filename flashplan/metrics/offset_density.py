"""Distributions that one comparator's offset may have: a density and both its tails."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from scipy.special import erfc, ndtr

# Probability beyond `reach` on either side: far below the smallest yield loss that is kept.
_TAIL = 1e-20


class OffsetDensity(Protocol):
    """What the exact yield asks of a distribution of offsets; all arguments and results in LSB.

    cdf and sf are the lower and the upper tail, each accurate to its own size. width: the length over which the
    density changes by its own size; reach: no offset worth counting is farther from zero; kinks: where the density or
    a derivative jumps; symmetric: whether the density is even.
    """

    @property
    def width(self) -> float: ...
    @property
    def reach(self) -> float: ...
    @property
    def kinks(self) -> tuple[float, ...]: ...
    @property
    def symmetric(self) -> bool: ...
    def pdf(self, x: Any) -> Any: ...
    def cdf(self, x: Any) -> Any: ...
    def sf(self, x: Any) -> Any: ...


@dataclass(frozen=True, slots=True)
class NormalOffsets:
    """Normal offsets of standard deviation sigma, in LSB. Complex arguments are continued analytically."""

    sigma: float
    kinks: tuple[float, ...] = ()
    symmetric: bool = True

    @property
    def width(self) -> float:
        return self.sigma

    @property
    def reach(self) -> float:
        return 9.3 * self.sigma

    def pdf(self, x: Any) -> Any:
        return np.exp(-0.5 * (x / self.sigma) ** 2) / (self.sigma * np.sqrt(2 * np.pi))

    def cdf(self, x: Any) -> Any:
        return _lower_tail(x / self.sigma)

    def sf(self, x: Any) -> Any:
        return _lower_tail(-x / self.sigma)


@dataclass(frozen=True, slots=True)
class TrimmedOffsets:
    """Offsets of a trimmed array: flat over one trim step, with normal edges.

    step: the trim step in LSB, what is left is spread evenly over +-step / 2; edge: standard deviation of the trim's
    own error in LSB, > 0. The density is the convolution of the two.
    """

    step: float
    edge: float
    kinks: tuple[float, ...] = ()
    symmetric: bool = True

    @property
    def width(self) -> float:
        return self.edge

    @property
    def reach(self) -> float:
        return self.step / 2 + 9.3 * self.edge

    def pdf(self, x: Any) -> Any:
        far = -np.abs(x)  # in the lower tail, where a difference of two tails keeps its accuracy
        up, down = (far + self.step / 2) / self.edge, (far - self.step / 2) / self.edge
        return (ndtr(up) - ndtr(down)) / self.step

    def cdf(self, x: Any) -> Any:
        up, down = (x + self.step / 2) / self.edge, (x - self.step / 2) / self.edge
        return self.edge / self.step * (_ramp(up) - _ramp(down))

    def sf(self, x: Any) -> Any:
        return self.cdf(-x)


@dataclass(frozen=True, slots=True)
class AnyOffsets:
    """Offsets of any density, given by its functions; see OffsetDensity for what each means."""

    pdf: Callable[[Any], Any]
    cdf: Callable[[Any], Any]
    sf: Callable[[Any], Any]
    width: float
    reach: float
    kinks: tuple[float, ...] = ()
    symmetric: bool = False


def offsets_from(distribution: Any, width: float | None = None) -> AnyOffsets:
    """Return a frozen scipy.stats distribution, in LSB, as a density of offsets.

    width: the length over which the density changes by its own size; the standard deviation if not given, which is
    right for one smooth hump. The ends of a bounded support count as kinks. Raises ValueError for a distribution
    whose tails are too heavy to end within a thousand widths.
    """
    width = float(distribution.std()) if width is None else width
    low, high = distribution.support()
    kinks = tuple(float(end) for end in (low, high) if np.isfinite(end))
    reach = float(max(-distribution.ppf(_TAIL), distribution.isf(_TAIL)))
    if not 0 < reach < 1000 * width:
        raise ValueError("the offsets' distribution has tails too heavy to integrate")
    return AnyOffsets(
        distribution.pdf, distribution.cdf, distribution.sf, width, reach, kinks
    )


def _lower_tail(t: Any) -> Any:
    return 0.5 * erfc(-t / np.sqrt(2.0)) if np.iscomplexobj(t) else ndtr(t)


def _ramp(t: Any) -> Any:
    """Integral of the normal distribution function up to t."""
    return t * ndtr(t) + np.exp(-0.5 * t**2) / np.sqrt(2 * np.pi)
