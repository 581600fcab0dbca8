"""A line or a grid of plans: each point's yield, effective bits, word error rate and power."""

from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import dataclass
from itertools import product
from pathlib import Path
from typing import Any

import numpy as np

from flashplan.budget.derive import derive_budget
from flashplan.chain import simulate_array
from flashplan.errors import InputError
from flashplan.plan.axis import Axis
from flashplan.plan.load import changed_plan
from flashplan.plan.model import Plan
from flashplan.study.progress import Progress
from flashplan.study.run import run_study


@dataclass(frozen=True)
class SweepPoint:
    """One plan of the grid. Values are None where the cell does not give what they need; `refused` says why the
    plan itself is impossible, and then nothing else is known."""

    vary: dict[str, float | int]
    limits: dict[str, float | None]
    yield_: float | None
    enob_low: float | None
    word_error_rate: float | None
    power: float | None
    goals_met: dict[str, bool | None]
    refused: str

    def to_dict(self) -> dict[str, Any]:
        """One entry of the JSON of the verb `sweep`."""
        return {
            "vary": dict(self.vary),
            "limits": dict(self.limits),
            "yield": self.yield_,
            "enob_low": self.enob_low,
            "word_error_rate": self.word_error_rate,
            "power": self.power,
            "goals_met": dict(self.goals_met),
            "refused": self.refused,
        }


@dataclass(frozen=True)
class SweepResult:
    """All points in grid order, the last axis running fastest."""

    axes: tuple[Axis, ...]
    points: tuple[SweepPoint, ...]

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `sweep`."""
        return {"points": [point.to_dict() for point in self.points]}


@dataclass(frozen=True)
class _Point:
    """Trial of the study: one plan of the grid. Picklable, for worker processes."""

    plan: Plan
    axes: tuple[Axis, ...]

    def __call__(self, index: int, generator: np.random.Generator) -> dict[str, Any]:
        values = list(product(*(axis.values for axis in self.axes)))[index]
        vary = {axis.key: value for axis, value in zip(self.axes, values, strict=True)}
        try:
            plan = changed_plan(self.plan, vary)
            budget = derive_budget(plan)
            result = simulate_array(plan)
        except InputError as error:
            return {"vary": vary, "refused": error.message}
        return {
            "vary": vary,
            "limits": {name: line.limit for name, line in budget.lines.items()},
            "yield": None if result.static is None else result.static.exact_yield,
            "enob_low": None if result.dynamic is None else result.dynamic.enob_low,
            "word_error_rate": result.word_error_rate,
            "power": result.power["total"],
            "goals_met": result.goals_met,
        }


def run_sweep(
    plan: Plan,
    axes: Sequence[Axis],
    store: str | Path | None = None,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> SweepResult:
    """Run every plan of the grid that the axes span.

    store: file that keeps finished points, so that an interrupted sweep goes on where it was. Every point draws with
    the plan's own seed, so that neighbours differ by what is varied and not by luck. Raises InputError.
    """
    axes = tuple(axes)
    repeated = {
        axis.key for axis in axes if sum(other.key == axis.key for other in axes) > 1
    }
    if repeated:
        raise InputError("is varied twice", f"--vary {min(repeated)}")
    count = int(np.prod([len(axis.values) for axis in axes]))
    found = run_study(
        # A plan read by another path is the same study.
        _Point(plan.model_copy(update={"source": Path(plan.source).name}), axes),
        count,
        seed=plan.array.seed,
        store=store,
        executor=executor,
        progress=progress,
    )
    return SweepResult(axes, tuple(_point(point) for point in found))


def _point(found: dict[str, Any]) -> SweepPoint:
    return SweepPoint(
        vary=found["vary"],
        limits=found.get("limits", {}),
        yield_=found.get("yield"),
        enob_low=found.get("enob_low"),
        word_error_rate=found.get("word_error_rate"),
        power=found.get("power"),
        goals_met=found.get(
            "goals_met", dict.fromkeys(("linearity", "enob", "word_error_rate"))
        ),
        refused=found.get("refused", ""),
    )
