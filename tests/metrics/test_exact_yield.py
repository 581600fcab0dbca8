import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flashplan.metrics import end_point_string, end_point_yield, fixed_line_yield
from flashplan.metrics.exact_yield import linearity_yield
from flashplan.metrics.linearity import FITS
from flashplan.metrics.offset_density import (
    AnyOffsets,
    NormalOffsets,
    TrimmedOffsets,
    offsets_from,
)
from flashplan.metrics.static_run import draw_threshold_errors, judge_arrays


@pytest.mark.parametrize(
    ("bits", "sigma", "dnl", "inl"),
    [
        (6, 0.1, 0.5, 0.5),
        (6, 0.1, 0.3, 1.0),
        (6, 0.3, 0.5, 0.5),
        (4, 0.1, 0.5, 0.33),
        (12, 0.05, 0.5, 0.5),
        (12, 0.0478, 0.5, 0.5),
        (8, 0.1, 0.5, math.inf),
        (8, 0.1, math.inf, 0.5),
        (6, 1.0, 0.2, 0.5),
    ],
)
def test_plain_yield_stands_to_a_millionth(
    bits: int, sigma: float, dnl: float, inl: float
) -> None:
    coarse = linearity_yield(bits, sigma, dnl, inl, "none")
    fine = linearity_yield(bits, sigma, dnl, inl, "none", refine=3)
    assert math.isclose(coarse.loss, fine.loss, rel_tol=1e-7)
    assert math.isclose(coarse.yield_, fine.yield_, rel_tol=1e-7)


@pytest.mark.parametrize("sigma", [0.045, 0.1, 0.2])
def test_loss_stands_to_a_billionth_part(sigma: float) -> None:
    result = linearity_yield(8, sigma, 0.5, 0.45, "none")
    fine = linearity_yield(8, sigma, 0.5, 0.45, "none", refine=4)
    assert math.isclose(result.loss, fine.loss, rel_tol=1e-6)
    if sigma == 0.045:
        assert result.loss < 1e-9 * 100 and result.loss > 1e-12


@pytest.mark.parametrize(
    ("fit", "bits", "sigma", "resistor_sigma"),
    [
        ("none", 6, 0.1, 0.01),
        ("none", 6, 0.1, 0.05),
        ("endpoint", 2, 0.15, 0.03),
        ("endpoint", 6, 0.1, 0.0),
        ("endpoint", 6, 0.06, 0.0),
        ("endpoint", 6, 0.1, 0.02),
        ("endpoint", 9, 0.08, 0.004),
        ("best", 3, 0.2, 0.0),
        ("best", 6, 0.1, 0.0),
        ("best", 6, 0.1, 0.02),
        ("best", 9, 0.08, 0.0),
    ],
)
def test_other_yields_stand_to_a_thousandth(
    fit: str, bits: int, sigma: float, resistor_sigma: float
) -> None:
    coarse = linearity_yield(bits, sigma, 0.5, 0.5, fit, resistor_sigma)
    fine = linearity_yield(bits, sigma, 0.5, 0.5, fit, resistor_sigma, refine=1)
    assert math.isclose(coarse.loss, fine.loss, rel_tol=1e-3)
    assert math.isclose(coarse.yield_, fine.yield_, rel_tol=1e-3)


@pytest.mark.parametrize(
    ("fit", "sigma", "resistor_sigma", "bow"),
    [
        ("none", 0.09, 0.01, 0.0),
        ("none", 0.08, 0.0, 0.1),
        ("endpoint", 0.09, 0.0, 0.0),
        ("endpoint", 0.08, 0.0, 0.1),
        ("endpoint", 0.08, 0.01, 0.0),
        ("best", 0.09, 0.0, 0.0),
        ("best", 0.08, 0.005, 0.0),
    ],
)
def test_squeezed_chains_agree_with_stepping(
    monkeypatch, fit: str, sigma: float, resistor_sigma: float, bow: float
) -> None:
    systematic = bow * np.sin(np.linspace(0, np.pi, 255))
    args = (8, sigma, 0.5, 0.5, fit, resistor_sigma, systematic)
    squeezed = linearity_yield(*args)
    for module in (fixed_line_yield, end_point_yield, end_point_string):
        monkeypatch.setattr(module, "may_squeeze", lambda *_: False)
    stepped = linearity_yield(*args)
    assert squeezed.loss != stepped.loss
    assert math.isclose(squeezed.loss, stepped.loss, rel_tol=3e-4)


def test_resistors_that_hardly_scatter_change_nothing() -> None:
    for fit in FITS:
        without = linearity_yield(6, 0.1, 0.5, 0.5, fit)
        nearly = linearity_yield(6, 0.1, 0.5, 0.5, fit, 1e-6)
        assert math.isclose(without.loss, nearly.loss, rel_tol=2e-4)


def test_systematic_errors_that_are_a_line_are_fitted_away() -> None:
    line = 0.2 + 0.001 * np.arange(63)
    for fit in ("endpoint", "best"):
        without = linearity_yield(6, 0.1, 0.5, 0.5, fit).loss
        with_line = linearity_yield(6, 0.1 * 1.001, 0.5, 0.5, fit, 0.0, line).loss
        assert math.isclose(without, with_line, rel_tol=5e-4)  # a slope is a larger LSB


@settings(max_examples=30, deadline=None)
@given(
    st.integers(2, 7),
    st.sampled_from(FITS),
    st.floats(0.05, 0.3),
    st.floats(0.2, 1.0),
    st.floats(0.2, 1.0),
)
def test_yield_falls_with_sigma_and_rises_with_either_goal(
    bits: int, fit: str, sigma: float, dnl: float, inl: float
) -> None:
    base = linearity_yield(bits, sigma, dnl, inl, fit)
    assert 0.0 <= base.loss <= 1.0
    assert math.isclose(base.yield_ + base.loss, 1.0, abs_tol=1e-12)
    slack = 1e-9 + 1e-4 * base.loss
    assert linearity_yield(bits, sigma * 1.1, dnl, inl, fit).loss >= base.loss - slack
    assert linearity_yield(bits, sigma, dnl * 1.1, inl, fit).loss <= base.loss + slack
    assert linearity_yield(bits, sigma, dnl, inl * 1.1, fit).loss <= base.loss + slack


@pytest.mark.parametrize("fit", ["none", "endpoint"])
@pytest.mark.parametrize("resistor_sigma", [0.0, 0.02])
def test_a_normal_density_given_by_its_functions_is_the_normal_one(
    fit: str, resistor_sigma: float
) -> None:
    normal = NormalOffsets(0.15)
    same = AnyOffsets(normal.pdf, normal.cdf, normal.sf, 0.15, 1.4)
    found = linearity_yield(
        4, 0.0, 0.5, 0.5, fit, resistor_sigma, offset_density=same
    ).loss
    plain = linearity_yield(4, 0.15, 0.5, 0.5, fit, resistor_sigma).loss
    assert math.isclose(found, plain, rel_tol=1e-4)


def test_uniform_offsets_have_a_closed_dnl_yield() -> None:
    from scipy.stats import uniform

    # three thresholds evenly spread over one LSB: the middle one decides how many partners either side has
    density = offsets_from(uniform(-0.5, 1.0))
    found = linearity_yield(2, 0.0, 0.5, math.inf, "none", offset_density=density)
    y = (np.arange(200_000) + 0.5) / 200_000
    near = np.minimum(y + 0.5, 1.0) - np.maximum(y - 0.5, 0.0)
    assert abs(found.yield_ - np.mean(near**2)) < 1e-9


def test_trimmed_offsets_are_a_density() -> None:
    density = TrimmedOffsets(0.3, 0.04)
    x = np.linspace(-density.reach, density.reach, 200_001)
    mass = np.cumsum(density.pdf(x)) * (x[1] - x[0])
    assert np.allclose(mass, density.cdf(x), atol=1e-5)
    assert np.allclose(density.cdf(x), density.sf(-x))
    assert 0 < density.cdf(-0.15 - 8 * 0.04) < 1e-15


@pytest.mark.parametrize("fit", FITS)
def test_without_offsets_the_string_alone_decides(fit: str) -> None:
    found = linearity_yield(4, 0.0, 0.6, 0.4, fit, 0.12)
    errors = draw_threshold_errors(np.random.default_rng(3), 100_000, 4, 0.0, 0.12)
    drawn = judge_arrays(errors, fit, 0.6, 0.4).passed.mean()
    assert abs(found.yield_ - drawn) < 4e-3
    little = linearity_yield(4, 0.002, 0.6, 0.4, fit, 0.12)
    assert abs(found.yield_ - little.yield_) < 2e-3


def test_without_offsets_and_mismatch_the_systematic_errors_decide() -> None:
    bow = 0.4 * np.sin(np.linspace(0, np.pi, 15))
    assert linearity_yield(4, 0.0, 0.5, 0.45, "none", 0.0, bow).yield_ == 1.0
    assert linearity_yield(4, 0.0, 0.5, 0.35, "none", 0.0, bow).yield_ == 0.0


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"bits": 13}, "bits must be"),
        ({"offset_sigma_lsb": -0.1}, "sigma must be zero or more"),
        ({"offset_sigma_lsb": math.nan}, "sigma must be zero or more"),
        ({"dnl_lsb": 0.0}, "DNL goal must be above zero"),
        ({"inl_lsb": -1.0}, "INL goal must be above zero"),
        ({"fit": "line"}, "fit must be one of none, endpoint, best"),
        ({"resistor_sigma": -0.1}, "resistors' sigma"),
        ({"systematic_lsb": [0.0, 0.1]}, "63 finite numbers"),
        ({"fit": "best", "offset_density": TrimmedOffsets(0.1, 0.1)}, "normal offsets"),
        (
            {
                "fit": "endpoint",
                "offset_density": AnyOffsets(abs, abs, abs, 1.0, 1.0, (0.5,)),
            },
            "soft edge",
        ),
    ],
)
def test_arguments_out_of_range_are_refused(change: dict, message: str) -> None:
    arguments = {
        "bits": 6,
        "offset_sigma_lsb": 0.1,
        "dnl_lsb": 0.5,
        "inl_lsb": 0.5,
        "fit": "none",
    }
    with pytest.raises(ValueError, match=message):
        linearity_yield(**(arguments | change))
