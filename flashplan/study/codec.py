"""Results of chunks as bytes and back, exactly: what is read again equals what was computed, bit by bit."""

import io
import json
from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

_TREE = "tree"


def encode_result(result: Any) -> bytes:
    """Return the bytes that stand for a result.

    result: any nesting of dicts with text keys, lists, tuples, numpy arrays and scalars, numbers, texts, bools, None.
    Arrays go into an npz archive as they are; the rest is JSON, whose floats Python writes so that they come back
    exactly. Raises TypeError for anything else, since a result that changed on its way would break the promise.

    >>> decode_result(encode_result({"a": (0.1, None), "b": np.arange(3)}))
    {'a': (0.1, None), 'b': array([0, 1, 2])}
    """
    arrays: dict[str, NDArray] = {}

    def keep(array: NDArray) -> str:
        name = str(len(arrays))
        arrays[name] = array
        return name

    tree = json.dumps(_to_tree(result, keep)).encode()
    buffer = io.BytesIO()
    np.savez(
        buffer,
        allow_pickle=False,
        **arrays,
        **{_TREE: np.frombuffer(tree, dtype=np.uint8)},
    )
    return buffer.getvalue()


def decode_result(data: bytes) -> Any:
    """Return the result that `encode_result` made the bytes from. Nothing in the bytes is executed."""
    with np.load(io.BytesIO(data), allow_pickle=False) as archive:
        tree = json.loads(archive[_TREE].tobytes())
        return _from_tree(tree, archive.__getitem__)


def _to_tree(value: Any, keep: Callable[[NDArray], str]) -> Any:
    # Numpy's float is a Python float too, so that numpy's types come first.
    if isinstance(value, np.ndarray) and not value.dtype.hasobject:
        return ["array", keep(value)]
    if isinstance(value, np.generic) and not isinstance(value, np.object_):
        return ["scalar", keep(np.asarray(value))]
    if value is None or type(value) in (bool, int, float, str):
        return value
    if type(value) is dict and all(type(key) is str for key in value):
        return ["dict", {key: _to_tree(part, keep) for key, part in value.items()}]
    if type(value) in (list, tuple):
        return [type(value).__name__, [_to_tree(part, keep) for part in value]]
    raise TypeError(f"a chunk's result cannot hold {value!r}")


def _from_tree(node: Any, fetch: Callable[[str], NDArray]) -> Any:
    if not isinstance(node, list):
        return node
    kind, content = node
    if kind == "array":
        return fetch(content)
    if kind == "scalar":
        return fetch(content)[()]
    if kind == "dict":
        return {key: _from_tree(part, fetch) for key, part in content.items()}
    parts = [_from_tree(part, fetch) for part in content]
    return tuple(parts) if kind == "tuple" else parts
