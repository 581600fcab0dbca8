"""What a budget says: one line per quantity, each with where its limit came from."""

from dataclasses import dataclass, field
from typing import Any

from flashplan.plan.model import Plan


@dataclass(frozen=True)
class Input:
    """A value that a limit was worked out from; a name with a dot is a key path of the plan."""

    value: float | str
    unit: str = ""


@dataclass(frozen=True)
class BudgetLine:
    """The limit of one quantity.

    limit: in `unit`, None where nothing limits it or it cannot be known, which `note` then explains.
    share: part of the error power beyond quantisation that the limit spends, None where it spends none.
    candidates: every limit that was considered, by name; `binding` names the one that was taken.
    """

    name: str
    limit: float | None
    unit: str
    formula: str
    source: str
    inputs: dict[str, Input]
    share: float | None = None
    candidates: dict[str, float] = field(default_factory=dict)
    binding: str = ""
    note: str = ""

    def to_dict(self) -> dict[str, Any]:
        """The line as plain JSON types."""
        return {
            "name": self.name,
            "limit": self.limit,
            "unit": self.unit,
            "share": self.share,
            "formula": self.formula,
            "source": self.source,
            "inputs": {
                name: {"value": i.value, "unit": i.unit}
                for name, i in self.inputs.items()
            },
            "candidates": dict(self.candidates),
            "binding": self.binding,
            "note": self.note,
        }


@dataclass(frozen=True)
class Budget:
    """All lines of a plan, by name, and the plan that they belong to."""

    plan: Plan
    lsb: float
    comparators: int
    ideal_error_lsb2: float
    allowed_error_lsb2: float
    lines: dict[str, BudgetLine]

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `budget`."""
        return {
            "name": self.plan.converter.name,
            "lsb": self.lsb,
            "comparators": self.comparators,
            "ideal_error_lsb2": self.ideal_error_lsb2,
            "allowed_error_lsb2": self.allowed_error_lsb2,
            "lines": [line.to_dict() for line in self.lines.values()],
        }
