"""A plan whose comparators and clock sit exactly on the budget's limits: what the budget promises is tested on it."""

from flashplan.budget.reference import resolved
from flashplan.budget.result import Budget
from flashplan.plan.load import changed_plan, with_cell
from flashplan.plan.model import Plan

_CELL_LINES = (
    "offset_sigma",
    "noise_sigma",
    "hysteresis",
    "skew_sigma",
    "regeneration_tau",
    "delay",
    "kickback_charge",
    "input_capacitance",
)


def plan_at_limits(budget: Budget, factor: float = 1.0) -> Plan:
    """The budget's plan with every comparator, and the clock, on `factor` times their limits.

    A quantity that nothing limits keeps the cell's own value; the ladder stays the plan's own, with "auto" resolved
    for the plan's own cell. Raises InputError as `resolved` does.
    """
    plan = resolved(budget.plan)
    limits = {name: line.limit for name, line in budget.lines.items()}
    values = {
        name: limit * factor
        for name in _CELL_LINES
        if (limit := limits[name]) is not None
    }
    jitter = limits["jitter_sigma"]
    if jitter is not None:
        plan = changed_plan(plan, {"clock.jitter_sigma": jitter * factor})
    return with_cell(plan, plan.datasheet.model_copy(update=values))
