import numpy as np
import pytest

from flashplan.metrics.linearity import FITS, dnl_inl
from flashplan.metrics.static_run import (
    code_percentiles,
    draw_threshold_errors,
    judge_arrays,
)


@pytest.mark.parametrize("fit", FITS)
@pytest.mark.parametrize("bits", [2, 5, 9])
def test_verdicts_follow_from_dnl_and_inl(fit: str, bits: int) -> None:
    bow = np.linspace(0, 0.2, 2**bits - 1) ** 2
    generator = np.random.default_rng(4)
    errors = draw_threshold_errors(generator, 5000, bits, 0.15, 0.01, bow)
    assert errors.shape == (5000, 2**bits - 1)
    dnl, inl = (np.abs(v).max(axis=1) for v in dnl_inl(errors, fit))
    for layout in (errors, np.ascontiguousarray(errors)):
        judged = judge_arrays(layout, fit, 0.5, 0.4)
        assert np.allclose(judged.max_dnl, dnl, rtol=0, atol=1e-12)
        assert np.allclose(judged.max_inl, inl, rtol=0, atol=1e-12)
        assert (judged.passed == ((dnl < 0.5) & (inl < 0.4))).all()


def test_judging_leaves_the_errors_alone() -> None:
    errors = draw_threshold_errors(np.random.default_rng(4), 100, 4, 0.15)
    before = errors.copy()
    for fit in FITS:
        judge_arrays(errors, fit, 0.5, 0.5)
    assert (errors == before).all()


def test_drawn_errors_have_the_covariance_of_offsets_and_a_pinned_string() -> None:
    generator, k = np.random.default_rng(5), np.arange(1, 16)
    errors = draw_threshold_errors(generator, 200_000, 4, 0.1, 0.05, k / 100)
    string = np.minimum.outer(k, k) * (16 - np.maximum.outer(k, k)) / 16
    expected = 0.1**2 * np.eye(15) + 0.05**2 * string
    assert np.allclose(errors.mean(axis=0), k / 100, atol=6 * 0.15 / 200_000**0.5)
    assert np.allclose(np.cov(errors.T), expected, atol=6 * 0.02 * (2 / 200_000) ** 0.5)


def test_percentiles_are_taken_code_by_code() -> None:
    errors = draw_threshold_errors(np.random.default_rng(6), 4001, 3, 0.1)
    dnl, inl = code_percentiles(errors, "best", [5, 50, 95])
    assert dnl.shape == (3, 6) and inl.shape == (3, 7)
    _, each = dnl_inl(errors, "best")
    assert np.allclose(inl[1], np.sort(each, axis=0)[2000])


@pytest.mark.parametrize("sigmas", [(-0.1, 0.0), (0.1, -0.1), (np.nan, 0.0)])
def test_negative_deviations_are_refused(sigmas: tuple[float, float]) -> None:
    with pytest.raises(ValueError, match="must not be negative"):
        draw_threshold_errors(np.random.default_rng(1), 10, 4, *sigmas)
