import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from flashplan.metrics.linearity import FITS, dnl_inl

ERRORS = arrays(
    np.float64,
    st.tuples(st.integers(1, 4), st.integers(3, 40)),
    elements=st.floats(-0.4, 0.4),
)


@given(ERRORS)
def test_end_point_dnl_sums_to_zero_and_inl_ends_at_zero(errors: np.ndarray) -> None:
    dnl, inl = dnl_inl(errors, "endpoint")
    assert np.allclose(dnl.sum(axis=-1), 0.0, atol=1e-12)
    assert np.allclose(inl[..., [0, -1]], 0.0, atol=1e-12)


@given(ERRORS)
def test_best_fit_inl_has_neither_mean_nor_slope(errors: np.ndarray) -> None:
    _, inl = dnl_inl(errors, "best")
    assert np.allclose(inl.mean(axis=-1), 0.0, atol=1e-12)
    assert np.allclose(inl @ np.arange(inl.shape[-1]), 0.0, atol=1e-9)


@given(ERRORS, st.sampled_from(FITS))
def test_inl_is_the_running_sum_of_dnl(errors: np.ndarray, fit: str) -> None:
    dnl, inl = dnl_inl(errors, fit)
    assert np.allclose(inl[..., 1:] - inl[..., :1], np.cumsum(dnl, axis=-1))


@given(ERRORS, st.floats(-0.2, 0.2), st.floats(-0.01, 0.01))
def test_fitted_lines_do_not_see_offset_and_gain(
    errors: np.ndarray, offset: float, tilt: float
) -> None:
    k = np.arange(1, errors.shape[-1] + 1)
    scaled = (1 + tilt) * (k + errors) + offset - k
    for fit in ("endpoint", "best"):
        for plain, moved in zip(
            dnl_inl(errors, fit), dnl_inl(scaled, fit), strict=True
        ):
            assert np.allclose(plain, moved, atol=1e-9)


def test_another_line_is_refused() -> None:
    with pytest.raises(ValueError, match='"none", "endpoint" or "best"'):
        dnl_inl([0.0, 0.1, 0.0], "terminal")  # type: ignore[arg-type]
    with pytest.raises(ValueError, match="two thresholds"):
        dnl_inl([0.0], "none")
