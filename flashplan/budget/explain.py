"""One budget line in full: how its limit moves with each key of the plan that it hangs on."""

from dataclasses import dataclass
from typing import Any

from flashplan.budget.derive import derive_line
from flashplan.budget.result import BudgetLine
from flashplan.errors import InputError
from flashplan.plan.load import changed_plan
from flashplan.plan.model import Plan

_STEP = 0.01  # relative; wide enough that a limit found by root search moves well beyond its tolerance


@dataclass(frozen=True)
class Sensitivity:
    """Change of a limit with one key of the plan.

    derivative: d limit / d value, in the limit's unit per the key's unit; elasticity: percent per percent.
    """

    key: str
    derivative: float
    elasticity: float


@dataclass(frozen=True)
class Explanation:
    """A budget line and what moves it, the strongest first."""

    line: BudgetLine
    sensitivities: tuple[Sensitivity, ...]

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `explain`."""
        return {
            **self.line.to_dict(),
            "sensitivities": {
                s.key: {"derivative": s.derivative, "elasticity": s.elasticity}
                for s in self.sensitivities
            },
        }


def explain_line(plan: Plan, name: str) -> Explanation:
    """Explain one line, with derivatives by differences over one percent of each key on either side.

    Keys that count things (bits, latch stages) or name things have no derivative and are left out, and so is a key
    neither of whose neighbouring values a plan can have. Raises InputError for a name that is not a line.
    """
    line = derive_line(plan, name)
    found = []
    for key, given in line.inputs.items():
        if (
            "." not in key
            or not isinstance(given.value, float)
            or given.value == 0
            or line.limit is None
        ):
            continue
        step = abs(given.value) * _STEP
        around = [
            (value, limit)
            for value, limit in (
                (given.value - step, _limit(plan, name, key, given.value - step)),
                (given.value, line.limit),
                (given.value + step, _limit(plan, name, key, given.value + step)),
            )
            if limit is not None
        ]
        if len(around) < 2:
            continue
        (low, low_limit), (high, high_limit) = around[0], around[-1]
        derivative = (high_limit - low_limit) / (high - low)
        elasticity = derivative * given.value / line.limit if line.limit else 0.0
        found.append(Sensitivity(key, derivative, elasticity))
    found.sort(key=lambda s: -abs(s.elasticity))
    return Explanation(line, tuple(found))


def _limit(plan: Plan, name: str, key: str, value: float) -> float | None:
    """The limit with one key changed, None where no plan can have that value."""
    try:
        return derive_line(changed_plan(plan, {key: value}), name).limit
    except InputError:
        return None
