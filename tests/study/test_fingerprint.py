"""What tells one study from another."""

import functools
import subprocess
import sys
from dataclasses import dataclass
from typing import Annotated

import numpy as np
import pytest
from pydantic import BaseModel, Field

from flashplan.study.fingerprint import content_digest, study_fingerprint
from tests.study.tasks import Scaled, draw


class Model(BaseModel):
    open: float = 1.0
    hidden: Annotated[float, Field(exclude=True)] = 2.0


@dataclass(frozen=True)
class Holder:
    values: np.ndarray


def _other(first: dict[str, str], second: dict[str, str]) -> set[str]:
    return {name for name in first | second if first.get(name) != second.get(name)}


def test_each_input_counts_under_its_own_name() -> None:
    plain = study_fingerprint(Scaled(2.0), 10, 1)
    assert _other(plain, study_fingerprint(Scaled(2.0), 10, 1)) == set()
    assert _other(plain, study_fingerprint(Scaled(2.5), 10, 1)) == {"scale"}
    assert _other(plain, study_fingerprint(Scaled(2.0), 11, 1)) == {"chunks"}
    assert _other(plain, study_fingerprint(Scaled(2.0), 10, 2)) == {"seed"}
    assert _other(plain, study_fingerprint(draw, 10, 1)) == {"scale", "task"}


def test_arguments_of_a_partial_count() -> None:
    first = study_fingerprint(functools.partial(draw, key=1), 2, 1)
    second = study_fingerprint(functools.partial(draw, key=2), 2, 1)
    assert _other(first, second) == {"key"}


@pytest.mark.parametrize(
    "first, second",
    [
        (1, 1.0),
        (1, True),
        ("ab", ["a", "b"]),
        ([1, [2]], [1, 2]),
        (np.arange(3), np.arange(3.0)),
        (np.zeros((2, 3)), np.zeros((3, 2))),
        (0.1, np.nextafter(0.1, 1)),
        (Model(), Model(open=1.5)),
        (Model(), Model(hidden=2.5)),  # a dump would not show it
        (Holder(np.arange(3)), Holder(np.arange(4))),
        ({"a": 1}, {"a": None}),
    ],
)
def test_different_content_has_a_different_digest(
    first: object, second: object
) -> None:
    assert content_digest(first) != content_digest(second)


def test_a_digest_is_the_same_in_another_process() -> None:
    program = (
        "from flashplan.study.fingerprint import content_digest;"
        "print(content_digest({'b': (1, 2.5), 'a': ['x', None]}))"
    )
    other = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=True
    )
    assert other.stdout.strip() == content_digest({"a": ["x", None], "b": (1, 2.5)})


def test_a_task_whose_content_cannot_be_told_is_refused() -> None:
    hidden = 3

    def closure(index: int, generator: np.random.Generator) -> int:
        return hidden

    for task in (closure, lambda index, generator: index):
        with pytest.raises(TypeError, match="cannot be told"):
            study_fingerprint(task, 1, 1)
    with pytest.raises(TypeError, match="cannot tell the content"):
        content_digest(object())
