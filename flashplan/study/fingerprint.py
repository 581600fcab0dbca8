"""What a study is, in a few texts: two studies with equal fingerprints have equal results."""

import dataclasses
import enum
import functools
import hashlib
import os
from collections.abc import Callable, Iterator, Mapping
from importlib import metadata
from types import FunctionType
from typing import Any

import numpy as np

DIGEST = "sha256 "  # begins a value that is a digest, which a message need not print


def study_fingerprint(
    task: Callable[..., Any], chunks: int, seed: int
) -> dict[str, str]:
    """Return what the results of a study depend on, by name.

    task: a function, a functools.partial of one, or a dataclass instance with __call__; each of its arguments or
    fields counts under its own name, so that a message can say which one differs. The versions count too, since
    numpy does not promise the same random stream in every release.
    Raises TypeError for a task, or a part of it, whose content cannot be told.
    """
    inputs = {
        name: DIGEST + content_digest(value) for name, value in _inputs(task).items()
    }
    return {
        **inputs,
        "task": _name(_function(task)),
        "seed": str(seed),
        "chunks": str(chunks),
        "flashplan version": _package_version(),
        "numpy version": np.__version__,
    }


def content_digest(value: object) -> str:
    """Return a digest of a value's content, the same in every process.

    value: None, bools, numbers, texts, paths, enumerations, numpy arrays, functions, and any nesting of them in
    sequences, mappings (order does not count), dataclasses and pydantic models, every field of them. Raises TypeError otherwise.

    >>> content_digest({"a": 1.0, "b": [2]}) == content_digest({"b": [2], "a": 1.0})
    True
    >>> content_digest(1.0) == content_digest(1)
    False
    """
    digest = hashlib.sha256()
    for token in _tokens(value):
        # The length in front keeps neighbouring tokens apart.
        digest.update(len(token).to_bytes(8, "big") + token)
    return digest.hexdigest()


def _inputs(task: Callable[..., Any]) -> dict[str, object]:
    if isinstance(task, functools.partial):
        positional = {
            f"argument {place}": value for place, value in enumerate(task.args, 1)
        }
        return {**_inputs(task.func), **positional, **task.keywords}
    if dataclasses.is_dataclass(task) and not isinstance(task, type):
        return {
            field.name: getattr(task, field.name) for field in dataclasses.fields(task)
        }
    _name(_function(task))
    return {}


def _function(task: Callable[..., Any]) -> object:
    if isinstance(task, functools.partial):
        return _function(task.func)
    return task if isinstance(task, FunctionType) else type(task)


def _name(function: object) -> str:
    name = (
        f"{getattr(function, '__module__', '')}.{getattr(function, '__qualname__', '')}"
    )
    if "<lambda>" in name or (
        isinstance(function, FunctionType) and function.__closure__
    ):
        raise TypeError(f"what {name} does cannot be told from its name")
    return name


def _tokens(value: Any) -> Iterator[bytes]:
    if isinstance(value, (np.ndarray, np.generic)) and not value.dtype.hasobject:
        yield f"array {value.dtype.str} {value.shape}".encode()
        yield value.tobytes()
    elif isinstance(value, enum.Enum):
        yield f"enum {_name(type(value))} {value.name}".encode()
    elif isinstance(value, float):
        yield f"float {value.hex()}".encode()
    elif value is None or isinstance(value, (bool, int, str, bytes)):
        yield f"{type(value).__name__} {value!r}".encode()
    elif isinstance(value, os.PathLike):
        yield f"path {os.fspath(value)}".encode()
    elif isinstance(value, Mapping):
        yield f"mapping {len(value)}".encode()
        for key in sorted(value, key=repr):
            yield from _tokens(key)
            yield from _tokens(value[key])
    elif isinstance(value, (list, tuple)):
        yield f"sequence {len(value)}".encode()
        for part in value:
            yield from _tokens(part)
    elif dataclasses.is_dataclass(value) and not isinstance(value, type):
        yield f"object {_name(type(value))}".encode()
        for field in dataclasses.fields(value):
            yield field.name.encode()
            yield from _tokens(getattr(value, field.name))
    elif hasattr(type(value), "model_fields"):
        # Field by field: a dump leaves out what is excluded from it, on which a result may hang all the same.
        yield f"object {_name(type(value))}".encode()
        for name in type(value).model_fields:
            yield name.encode()
            yield from _tokens(getattr(value, name))
    elif isinstance(value, FunctionType):
        yield f"function {_name(value)}".encode()
    else:
        raise TypeError(f"cannot tell the content of {value!r}")


def _package_version() -> str:
    try:
        return metadata.version("flashplan")
    except metadata.PackageNotFoundError:
        return "not installed"
