"""Intervals of what is estimated from trials: of a share, and of a quantile."""

import numpy as np
from numpy.typing import ArrayLike
from scipy.stats import beta, binom, norm


def wilson_interval(
    successes: int, trials: int, confidence: float = 0.95
) -> tuple[float, float]:
    """Return the score interval of a probability from `successes` out of `trials`.

    (p + z^2/2n -+ z sqrt(p (1 - p) / n + z^2/4n^2)) / (1 + z^2/n), p = successes / trials. Close to its confidence on
    average over p, also at small counts. Raises ValueError for counts or a confidence out of range.
    Source: E. B. Wilson, J. Am. Stat. Assoc. 22, 1927 (memory).

    >>> low, high = wilson_interval(0, 100)
    >>> print(f"{low:.4f} {high:.4f}")
    0.0000 0.0370
    """
    _check(successes, trials, confidence)
    z2 = norm.isf((1 - confidence) / 2) ** 2
    share = successes / trials
    middle = share + z2 / (2 * trials)
    half = np.sqrt(z2 * share * (1 - share) / trials + (z2 / (2 * trials)) ** 2)
    scale = 1 + z2 / trials
    low = 0.0 if successes == 0 else (middle - half) / scale
    high = 1.0 if successes == trials else (middle + half) / scale
    return float(low), float(high)


def clopper_pearson_interval(
    successes: int, trials: int, confidence: float = 0.95
) -> tuple[float, float]:
    """Return the interval of a probability whose confidence is never below the one asked for.

    The tails of the binomial distribution, solved by the beta distribution. Raises ValueError as wilson_interval.
    Source: C. J. Clopper, E. S. Pearson, Biometrika 26, 1934 (memory).

    >>> low, high = clopper_pearson_interval(0, 100)
    >>> print(f"{low:.4f} {high:.4f}")
    0.0000 0.0362
    """
    _check(successes, trials, confidence)
    tail, failures = (1 - confidence) / 2, trials - successes
    low = beta.ppf(tail, successes, failures + 1) if successes else 0.0
    high = beta.isf(tail, successes + 1, failures) if failures else 1.0
    return float(low), float(high)


def quantile_interval(
    values: ArrayLike, share: float, confidence: float = 0.95
) -> tuple[float, float, float]:
    """Return the sample quantile of `values` and an interval of the true one, from order statistics.

    The number of values below the true quantile is binomial(n, share), whatever the distribution; the interval lies
    between the order statistics that hold it with at least this confidence, and is infinite on a side where the
    sample is too small. values: (n,), n >= 1; share and confidence between 0 and 1, exclusive. Raises ValueError
    otherwise.
    Source: H. A. David, H. N. Nagaraja, "Order Statistics", 3rd ed., 2003, section 7.1 (memory).

    >>> quantile_interval(range(1, 101), 0.5)
    (50.5, 40.0, 61.0)
    """
    ordered = np.sort(np.asarray(values, dtype=np.float64))
    count = len(ordered)
    _check(0, count, confidence)
    if not 0 < share < 1:
        raise ValueError(f"the share must be between 0 and 1, found {share!r}")
    tail = (1 - confidence) / 2
    # P(X_(low) > q) = P(below < low) <= tail, P(X_(high) < q) = P(below >= high) <= tail, ranks from 1
    low = int(binom.ppf(tail, count, share))
    high = int(binom.isf(tail, count, share)) + 1
    return (
        float(np.quantile(ordered, share)),
        float(ordered[low - 1]) if low >= 1 else -np.inf,
        float(ordered[high - 1]) if high <= count else np.inf,
    )


def _check(successes: int, trials: int, confidence: float) -> None:
    if not 0 <= successes <= trials or trials < 1:
        raise ValueError(
            f"expected 0 to {trials} successes in at least one trial, found {successes!r} in {trials!r}"
        )
    if not 0 < confidence < 1:
        raise ValueError(f"confidence must be between 0 and 1, found {confidence!r}")
