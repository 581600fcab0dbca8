"""Results survive as bytes exactly."""

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from flashplan.study.codec import decode_result, encode_result

SCALARS = st.none() | st.booleans() | st.integers() | st.floats() | st.text()
RESULTS = st.recursive(
    SCALARS,
    lambda inner: (
        st.lists(inner) | st.lists(inner).map(tuple) | st.dictionaries(st.text(), inner)
    ),
    max_leaves=12,
)


def _same(first: Any, second: Any) -> bool:
    """Equal in type and value, not-a-number and the sign of zero included."""
    if type(first) is not type(second):
        return False
    if isinstance(first, dict):
        return list(first) == list(second) and all(
            _same(first[key], second[key]) for key in first
        )
    if isinstance(first, (list, tuple)):
        return len(first) == len(second) and all(map(_same, first, second))
    if isinstance(first, float):
        return (math.isnan(first) and math.isnan(second)) or (
            first.hex() == second.hex()
        )
    return bool(first == second)


@given(RESULTS)
def test_any_nesting_comes_back_as_it_was(result: Any) -> None:
    assert _same(decode_result(encode_result(result)), result)


@pytest.mark.parametrize(
    "array",
    [
        np.random.default_rng(1).normal(size=(3, 4)).T,
        np.array([np.nan, -0.0, np.inf, 5e-324]),
        np.zeros((0, 7), dtype=bool),
        np.array(3, dtype=np.uint8),
        np.array([1 + 2j]),
    ],
)
def test_arrays_come_back_bit_by_bit(array: np.ndarray) -> None:
    back = decode_result(encode_result({"array": array, "tree": array}))
    for name in ("array", "tree"):
        assert back[name].dtype == array.dtype
        assert back[name].shape == array.shape
        assert back[name].tobytes() == array.tobytes()


def test_numpy_scalars_keep_their_type() -> None:
    back = decode_result(encode_result([np.float32(0.1), np.bool_(True), np.int64(7)]))
    assert [type(value) for value in back] == [np.float32, np.bool_, np.int64]
    assert back[0] == np.float32(0.1)


@pytest.mark.parametrize(
    "result", [{1: 2}, {3}, b"x", np.array([None]), object(), {"a": [print]}]
)
def test_what_would_change_on_its_way_is_refused(result: Any) -> None:
    with pytest.raises(TypeError, match="cannot hold"):
        encode_result(result)
