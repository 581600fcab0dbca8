"""One axis of a sweep: a numeric key of the plan and the values that it takes."""

import types
import typing
from dataclasses import dataclass

import numpy as np
from pydantic import BaseModel

from flashplan.errors import InputError
from flashplan.plan.fields import Unit
from flashplan.plan.load import nearest_key
from flashplan.plan.model import Plan
from flashplan.quantity import parse_quantity

_FORM = "KEY=START:STOP:COUNT, KEY=START:STOP:COUNT:log or KEY=VALUE,VALUE,..."


@dataclass(frozen=True)
class Axis:
    """A key path of the plan, its unit ("" for a count) and its values in SI."""

    key: str
    unit: str
    values: tuple[float | int, ...]


def parse_axis(text: str) -> Axis:
    """Read "converter.bits=4:8:5" and the like. Raises InputError that names the axis and what is accepted.

    >>> parse_axis("comparator.datasheet.noise_sigma=1 mV:4 mV:3:log").values
    (0.001, 0.002, 0.004)
    >>> parse_axis("converter.bits=4,6,8").values
    (4, 6, 8)
    """
    key, equals, values = text.partition("=")
    key = key.strip()
    if not equals or not values.strip():
        raise InputError(f"expected {_FORM}, found {text!r}", "--vary")
    whole, unit = _kind(key)
    where = f"--vary {key}"
    try:
        found = _values(values, "ratio" if whole else unit)
    except ValueError as error:
        raise InputError(str(error), where) from None
    if whole:
        if any(value != round(value) for value in found):
            raise InputError(f"takes whole numbers; {text!r} gives {found}", where)
        return Axis(key, "", tuple(round(value) for value in found))
    return Axis(key, unit, tuple(found))


def _values(text: str, unit: str) -> list[float]:
    if ":" not in text:
        return [parse_quantity(part.strip(), unit) for part in text.split(",")]
    parts = [part.strip() for part in text.split(":")]
    if len(parts) not in (3, 4) or (len(parts) == 4 and parts[3] != "log"):
        raise ValueError(f"expected {_FORM}, found {text!r}")
    start, stop = parse_quantity(parts[0], unit), parse_quantity(parts[1], unit)
    if not parts[2].isdigit() or not 2 <= int(parts[2]) <= 10_000:
        raise ValueError(
            f"COUNT must be a whole number from 2 to 10000, found {parts[2]!r}"
        )
    if len(parts) == 3:
        return [float(value) for value in np.linspace(start, stop, int(parts[2]))]
    if start <= 0 or stop <= 0:
        raise ValueError("log spacing needs START and STOP above zero")
    # Rounding hides the last bit that a power leaves, so that 2 is 2 in tables and stores.
    return [
        float(f"{value:.14g}") for value in np.geomspace(start, stop, int(parts[2]))
    ]


def _kind(key: str) -> tuple[bool, str]:
    """Whether a key takes whole numbers, and its unit. Raises InputError for a key that is not there or not a number."""
    table: type[BaseModel] = Plan
    *parents, last = key.split(".")
    for depth, parent in enumerate(parents):
        inner = _table(table, parent)
        if inner is None:
            raise InputError(
                f"unknown key{nearest_key(parent, table)}",
                f"--vary {'.'.join(parents[: depth + 1])}",
            )
        table = inner
    field = next(
        (
            f
            for name, f in table.model_fields.items()
            if last == (f.alias or name) and not f.exclude
        ),
        None,
    )
    if field is None:
        raise InputError(f"unknown key{nearest_key(last, table)}", f"--vary {key}")
    for kind in (*field.metadata, *_arms(field.annotation)):
        if isinstance(kind, Unit):
            return False, kind.unit
        if kind is int or (
            typing.get_origin(kind) is typing.Annotated
            and typing.get_args(kind)[0] is int
        ):
            return True, ""
        if typing.get_origin(kind) is typing.Annotated:
            unit = next(
                (item for item in typing.get_args(kind)[1:] if isinstance(item, Unit)),
                None,
            )
            if unit is not None:
                return False, unit.unit
    raise InputError("is not a number and cannot be swept", f"--vary {key}")


def _arms(annotation: object) -> tuple[object, ...]:
    if typing.get_origin(annotation) in (typing.Union, types.UnionType):
        return typing.get_args(annotation)
    return (annotation,)


def _table(table: type[BaseModel], key: str) -> type[BaseModel] | None:
    field = table.model_fields.get(key)
    if field is None or field.exclude:
        return None
    kinds = [
        kind
        for kind in _arms(field.annotation)
        if isinstance(kind, type) and issubclass(kind, BaseModel)
    ]
    return kinds[0] if kinds else None
