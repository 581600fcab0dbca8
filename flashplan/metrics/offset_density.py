"""Distributions that one comparator's offset may have: a density and both its tails."""

from dataclasses import dataclass, field
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray
from scipy.special import erfc, ndtr

# Probability beyond `reach` on either side: far below the smallest yield loss that is kept.
_TAIL = 1e-20


class OffsetDensity(Protocol):
    """What the exact yield asks of a distribution of offsets; all arguments and results in LSB.

    cdf and sf are the lower and upper tail, each accurate to its own size. width: the length over which the density
    changes by its own size; reach: no offset worth counting is further from zero; kinks: where the density or a
    derivative jumps; symmetric: whether the density is even.
    """

    width: float
    reach: float
    kinks: tuple[float, ...]
    symmetric: bool

    def pdf(self, x: Any) -> Any: ...
    def cdf(self, x: Any) -> Any: ...
    def sf(self, x: Any) -> Any: ...


@dataclass(frozen=True)
class NormalOffsets:
    """Independent normal offsets of standard deviation sigma, in LSB. Complex arguments are continued analytically."""

    sigma: float
    kinks: tuple[float, ...] = ()
    symmetric: bool = True

    @property
    def width(self) -> float:  # type: ignore[override]
        return self.sigma

    @property
    def reach(self) -> float:  # type: ignore[override]
        return 9.3 * self.sigma

    def pdf(self, x: Any) -> Any:
        return np.exp(-0.5 * (x / self.sigma) ** 2) / (self.sigma * np.sqrt(2 * np.pi))

    def cdf(self, x: Any) -> Any:
        return _lower_tail(x / self.sigma)

    def sf(self, x: Any) -> Any:
        return _lower_tail(-x / self.sigma)


def _lower_tail(t: Any) -> Any:
    return 0.5 * erfc(-t / np.sqrt(2.0)) if np.iscomplexobj(t) else ndtr(t)
