"""A datasheet judged against the budget, line by line."""

from dataclasses import dataclass
from typing import Any

from flashplan.budget.derive import derive_budget
from flashplan.budget.result import Budget, BudgetLine
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.load import with_cell
from flashplan.plan.model import Plan

# Limits are closed forms or root searches; a value exactly on its limit meets it.
TOLERANCE = 1e-6

# What a ladder resistance of "auto" uses up by itself: no margin there says nothing of the cell.
_SET_BY_AUTO = ("ladder_resistance", "kickback_charge")
TAKEN = 'used up by total_resistance = "auto"'

# Keys of a cell that shift the limits of other keys instead of being judged themselves.
_SHAPING = ("regeneration_gain", "coupling_capacitance")


@dataclass(frozen=True)
class VerdictLine:
    """One quantity: margin is (limit - value) / limit, None where not judged; `note` says why not."""

    name: str
    limit: float | None
    value: float | None
    unit: str
    margin: float | None
    met: bool | None
    note: str = ""

    def to_dict(self) -> dict[str, Any]:
        """The line as plain JSON types."""
        return {
            "name": self.name,
            "limit": self.limit,
            "value": self.value,
            "unit": self.unit,
            "margin": self.margin,
            "met": self.met,
            "note": self.note,
        }


@dataclass(frozen=True)
class Verdict:
    """All lines; met only if every line that has a limit was judged and met."""

    met: bool
    lines: dict[str, VerdictLine]

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `check`."""
        return {
            "met": self.met,
            "lines": [line.to_dict() for line in self.lines.values()],
        }


def check_cell(cell: Datasheet, budget: Budget) -> Verdict:
    """Judge a cell, and the plan's own clock and ladder, against a budget.

    A value on its limit meets it (relative tolerance 1e-6). A quantity that the datasheet does not give is not judged
    and keeps the verdict from being met. Where the cell's own regeneration gain or coupling capacitance differs from
    those that the budget was derived with, the limits that hang on them are derived anew.
    """
    budget = _budget_for(cell, budget)
    auto = budget.plan.ladder.total_resistance == "auto"
    lines = {
        name: _judged(line, _value(name, cell, budget.plan), auto)
        for name, line in budget.lines.items()
    }
    met = all(line.met for line in lines.values() if line.limit is not None)
    return Verdict(met, lines)


def _budget_for(cell: Datasheet, budget: Budget) -> Budget:
    own = {
        key: getattr(cell, key) for key in _SHAPING if getattr(cell, key) is not None
    }
    known = budget.plan.datasheet
    if all(getattr(known, key) == value for key, value in own.items()):
        return budget
    return derive_budget(with_cell(budget.plan, known.model_copy(update=own)))


def _value(name: str, cell: Datasheet, plan: Plan) -> float | None:
    """The value to judge: of the clock and the ladder from the plan, of all else from the cell."""
    if name == "jitter_sigma":
        return plan.clock.jitter_sigma
    if name == "resistor_sigma":
        return plan.ladder.resistor_sigma
    if name == "ladder_resistance":
        given = plan.ladder.total_resistance
        return None if given == "auto" else float(given)
    value: float | None = getattr(cell, name)
    return value


def _judged(line: BudgetLine, value: float | None, auto: bool) -> VerdictLine:
    if line.limit is None:
        return VerdictLine(line.name, None, value, line.unit, None, None, line.note)
    if value is None and line.name == "ladder_resistance":
        value = line.limit
    if value is None:
        return VerdictLine(
            line.name,
            line.limit,
            None,
            line.unit,
            None,
            None,
            "the datasheet does not give it",
        )
    margin = (
        (line.limit - value) / line.limit
        if line.limit
        else (0.0 if value == 0 else -1.0)
    )
    met = value <= line.limit * (1 + TOLERANCE)
    taken = auto and line.name in _SET_BY_AUTO and abs(margin) <= TOLERANCE
    return VerdictLine(
        line.name,
        line.limit,
        value,
        line.unit,
        margin,
        met,
        TAKEN if taken else line.note,
    )
