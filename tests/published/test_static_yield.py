"""The exact linearity yield against closed forms, library integrals, published figures and brute-force draws."""

import math

import numpy as np
import pytest
from scipy.stats import binomtest, multivariate_normal, norm

from flashplan.metrics.exact_yield import linearity_yield
from flashplan.metrics.intervals import clopper_pearson_interval, wilson_interval
from flashplan.metrics.offset_density import TrimmedOffsets
from flashplan.metrics.offset_limit import largest_offset_sigma

# sigma in LSB for a yield of 50, 90, 95, 99, 99.9 % with all thresholds within half an LSB: solutions of
# erf(0.5 / (sigma sqrt 2))^(2^N - 1) = yield, to 1e-5. Formula: Pelgrom, Tuinhout, Vertregt, IEDM 1998; Uyttenhove,
# Steyaert, IEEE TCAS-II 2002 (from memory)
SIGMAS = {
    3: (0.29882, 0.20544, 0.18637, 0.15686, 0.13147),
    4: (0.24960, 0.18540, 0.17078, 0.14699, 0.12538),
    5: (0.21849, 0.17067, 0.15891, 0.13907, 0.12028),
    6: (0.19650, 0.15907, 0.14934, 0.13242, 0.11585),
    7: (0.17988, 0.14957, 0.14134, 0.12668, 0.11189),
    8: (0.16676, 0.14158, 0.13450, 0.12163, 0.10833),
    9: (0.15606, 0.13472, 0.12855, 0.11713, 0.10509),
    10: (0.14712, 0.12875, 0.12331, 0.11310, 0.10212),
}


@pytest.mark.parametrize("bits", SIGMAS)
def test_largest_offset_for_an_inl_yield(bits: int) -> None:
    goals = (0.5, 0.9, 0.95, 0.99, 0.999)
    found = [largest_offset_sigma(bits, y, math.inf, 0.5, "none") for y in goals]
    assert np.allclose(found, SIGMAS[bits], atol=1e-5)


@pytest.mark.parametrize(
    ("bits", "limit", "sigma", "exact", "independent"),
    [
        # transfer-kernel recursion, worked out independently, to 2e-6; the textbook's product of independent codes
        # (Pelgrom, "Analog-to-Digital Conversion", chapter on flash converters, from memory) misses it by percents
        (4, 0.5, 0.2, 0.383877, 0.325211),
        (5, 0.5, 0.15, 0.606728, 0.572457),
        (6, 0.5, 0.125, 0.762744, 0.747740),
        (8, 0.5, 0.1, 0.904541, 0.901778),
        (6, 1.0, 0.25, 0.762744, 0.747740),
    ],
)
def test_dnl_yield_of_codes_that_share_thresholds(
    bits: int, limit: float, sigma: float, exact: float, independent: float
) -> None:
    found = linearity_yield(bits, sigma, limit, math.inf, "none").yield_
    assert abs(found - exact) < 2e-6
    product = math.erf(limit / (2 * sigma)) ** (2**bits - 2)
    assert abs(product - independent) < 1e-6
    assert found > product


@pytest.mark.parametrize(
    ("bits", "sigma", "fit", "published"),
    [
        # draws of 2e5 arrays, |INL| < 0.5, to 0.002: the line decides
        (6, 0.1, "endpoint", 0.9929),
        (6, 0.1, "best", 0.99997),
        (6, 0.125, "endpoint", 0.910),
        (6, 0.125, "best", 0.9970),
        (6, 0.125, "none", 0.9960),
        (4, 0.15, "endpoint", 0.898),
        (4, 0.15, "best", 0.9947),
    ],
)
def test_inl_yield_depends_on_the_line(
    bits: int, sigma: float, fit: str, published: float
) -> None:
    found = linearity_yield(bits, sigma, math.inf, 0.5, fit).yield_
    assert abs(found - published) < 0.002


@pytest.mark.parametrize("sigma", [0.075, 0.12, 0.3])
@pytest.mark.parametrize("bits", [2, 6, 12])
def test_inl_yield_is_a_product_of_normal_intervals(bits: int, sigma: float) -> None:
    found = linearity_yield(bits, sigma, math.inf, 0.5, "none")
    log_yield = (2**bits - 1) * np.log1p(-2 * norm.sf(0.5 / sigma))  # scipy.stats
    assert math.isclose(found.yield_, np.exp(log_yield), rel_tol=1e-6)
    assert math.isclose(found.loss, -np.expm1(log_yield), rel_tol=1e-6)


# of the library's integration, from seed to seed
BOX_SCATTER = 6e-5


def _box(covariance: np.ndarray, limits: np.ndarray, tolerance: float) -> float:
    # scipy.stats: Genz's integration
    return multivariate_normal.cdf(
        limits,
        np.zeros(len(limits)),
        covariance,
        allow_singular=True,
        maxpts=2_000_000,
        abseps=tolerance,
        releps=0,
        lower_limit=-limits,
        rng=np.random.default_rng(7),
    )


@pytest.mark.parametrize(("sigma", "dnl", "inl"), [(0.2, 0.5, 0.4), (0.3, 0.6, 0.5)])
def test_two_bits_are_a_normal_box(sigma: float, dnl: float, inl: float) -> None:
    to_both = np.array([[1, 0, 0], [0, 1, 0], [0, 0, 1], [-1, 1, 0], [0, -1, 1.0]])
    limits = np.array([inl] * 3 + [dnl] * 2)
    box = _box(sigma**2 * to_both @ to_both.T, limits, 1e-7)
    found = linearity_yield(2, sigma, dnl, inl, "none").yield_
    assert abs(found - box) < BOX_SCATTER


@pytest.mark.parametrize("resistor_sigma", [0.0, 0.05])
def test_three_bits_with_resistors_are_a_normal_box(resistor_sigma: float) -> None:
    sigma, limit, k = 0.2, 0.5, np.arange(1, 8)
    string = np.minimum.outer(k, k) * (8 - np.maximum.outer(k, k)) / 8
    covariance = sigma**2 * np.eye(7) + resistor_sigma**2 * string
    steps = np.diff(np.eye(7), axis=0)
    box = _box(steps @ covariance @ steps.T, np.full(6, limit), 1e-6)
    found = linearity_yield(3, sigma, limit, math.inf, "none", resistor_sigma).yield_
    assert abs(found - box) < BOX_SCATTER
    box = _box(covariance, np.full(7, limit), 1e-6)
    found = linearity_yield(3, sigma, math.inf, limit, "none", resistor_sigma).yield_
    assert abs(found - box) < BOX_SCATTER


def test_three_bits_with_the_best_line_are_a_normal_box() -> None:
    # at a small sigma the fitted LSB is one, and the residuals are normal
    k = np.arange(7) - 3.0
    hat = np.full((7, 7), 1 / 7) + np.outer(k, k) / (k @ k)
    steps = np.diff(np.eye(7), axis=0)
    to_both = np.concatenate([np.eye(7) - hat, steps @ (np.eye(7) - hat)])
    sigma, goal = 1e-4, 2e-4
    box = _box(to_both @ to_both.T, np.full(13, goal / sigma), 1e-6)
    found = linearity_yield(3, sigma, goal, goal, "best").yield_
    assert abs(found - box) < BOX_SCATTER


def brute_force(
    bits: int,
    sigma: float,
    resistor_sigma: float,
    systematic: np.ndarray,
    fit: str,
    dnl: float,
    inl: float,
    arrays: int,
    trim_step: float = 0.0,
) -> tuple[float, float]:
    """Yield and its standard deviation from draws, by np.polyfit's line and a generator of another family."""
    generator = np.random.Generator(np.random.MT19937(20240229))
    units, passed, chunk = 2**bits, 0, 100_000
    k = np.arange(1, units)
    for _ in range(arrays // chunk):
        position = k + systematic + sigma * generator.normal(size=(chunk, units - 1))
        position += trim_step * (generator.random((chunk, units - 1)) - 0.5)
        if resistor_sigma:
            resistor = 1 + resistor_sigma * generator.normal(size=(chunk, units))
            walk = np.cumsum(resistor - resistor.mean(axis=1, keepdims=True), axis=1)
            position += walk[:, :-1]
        if fit == "none":
            slope, start = np.ones(chunk), np.zeros(chunk)
        elif fit == "endpoint":
            slope = (position[:, -1] - position[:, 0]) / (units - 2)
            start = position[:, 0] - slope
        else:
            slope, start = np.polyfit(k, position.T, 1)
        ideal = start[:, None] + slope[:, None] * k
        inl_max = np.abs((position - ideal) / slope[:, None]).max(axis=1)
        dnl_max = np.abs(np.diff(position, axis=1) / slope[:, None] - 1).max(axis=1)
        passed += int(((inl_max < inl) & (dnl_max < dnl)).sum())
    share = passed / arrays
    return share, math.sqrt(share * (1 - share) / arrays)


@pytest.mark.parametrize(
    ("bits", "sigma", "resistor_sigma", "bow", "fit"),
    [
        (4, 0.14, 0.0, 0.0, "none"),
        (4, 0.14, 0.0, 0.15, "none"),
        (4, 0.14, 0.04, 0.1, "none"),
        (4, 0.14, 0.0, 0.0, "endpoint"),
        (4, 0.14, 0.03, 0.0, "endpoint"),
        (4, 0.13, 0.03, 0.1, "endpoint"),
        (2, 0.2, 0.05, 0.05, "endpoint"),
        (3, 0.2, 0.0, 0.0, "best"),
        (4, 0.14, 0.0, 0.15, "best"),
        (4, 0.14, 0.03, 0.1, "best"),
        (2, 0.3, 0.1, 0.1, "best"),
    ],
)
def test_yield_against_a_million_draws(
    bits: int, sigma: float, resistor_sigma: float, bow: float, fit: str
) -> None:
    systematic = bow * np.sin(np.linspace(0.2, 2.9, 2**bits - 1))
    found = linearity_yield(bits, sigma, 0.5, 0.45, fit, resistor_sigma, systematic)
    share, deviation = brute_force(
        bits, sigma, resistor_sigma, systematic, fit, 0.5, 0.45, 1_000_000
    )
    assert abs(found.yield_ - share) < 4 * deviation


@pytest.mark.parametrize("fit", ["none", "endpoint"])
def test_yield_of_a_trimmed_array_against_draws(fit: str) -> None:
    density = TrimmedOffsets(step=0.4, edge=0.06)
    found = linearity_yield(4, 0.0, 0.5, 0.5, fit, offset_density=density)
    share, deviation = brute_force(
        4, 0.06, 0.0, np.zeros(15), fit, 0.5, 0.5, 500_000, trim_step=0.4
    )
    assert abs(found.yield_ - share) < 4 * deviation


def test_eight_bits_need_about_a_tenth_of_an_lsb() -> None:
    # common practice, no source
    for fit in ("none", "endpoint", "best"):
        assert 0.07 < largest_offset_sigma(8, 0.99, 0.5, 0.5, fit) < 0.12


@pytest.mark.parametrize(("successes", "trials"), [(0, 20), (3, 20), (997, 1000)])
def test_intervals_of_a_share(successes: int, trials: int) -> None:
    # scipy.stats.binomtest
    test = binomtest(successes, trials)
    for method, interval in (
        ("wilson", wilson_interval),
        ("exact", clopper_pearson_interval),
    ):
        outside = test.proportion_ci(0.9, method)
        assert np.allclose(
            interval(successes, trials, 0.9), (outside.low, outside.high), atol=1e-12
        )
