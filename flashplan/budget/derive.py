"""The whole budget of a plan: every line of the contract, in the order a designer reads them."""

from collections.abc import Callable

from flashplan.budget.matching import offset_line, resistor_line
from flashplan.budget.reference import kickback_line, ladder_line
from flashplan.budget.regeneration import delay_line, tau_line
from flashplan.budget.result import Budget, BudgetLine
from flashplan.budget.room import ErrorRoom, error_room
from flashplan.budget.shares import hysteresis_line, jitter_line, noise_line, skew_line
from flashplan.budget.source import input_capacitance_line
from flashplan.errors import InputError
from flashplan.plan.model import Plan
from flashplan.study.threads import one_thread

LINES: dict[str, Callable[[Plan, ErrorRoom], BudgetLine]] = {
    "offset_sigma": offset_line,
    "noise_sigma": noise_line,
    "hysteresis": hysteresis_line,
    "skew_sigma": skew_line,
    "jitter_sigma": jitter_line,
    "regeneration_tau": lambda plan, room: tau_line(plan),
    "delay": lambda plan, room: delay_line(plan),
    "kickback_charge": kickback_line,
    "ladder_resistance": ladder_line,
    "resistor_sigma": resistor_line,
    "input_capacitance": lambda plan, room: input_capacitance_line(plan),
}


def derive_budget(plan: Plan) -> Budget:
    """Limit of every per-comparator and ladder quantity, with formula, source, inputs and share.

    Raises InputError when the plan's goals cannot be met by any cell.
    """
    with one_thread():
        room = error_room(plan)
        lines = {name: build(plan, room) for name, build in LINES.items()}
    return Budget(
        plan=plan,
        lsb=plan.lsb,
        comparators=plan.comparators,
        ideal_error_lsb2=room.ideal,
        allowed_error_lsb2=room.allowed,
        lines=lines,
    )


def derive_line(plan: Plan, name: str) -> BudgetLine:
    """One line of the budget alone. Raises InputError for a name that is not a line, naming those that are."""
    if name not in LINES:
        raise InputError(
            f"there is no budget line {name!r}; the lines are {', '.join(LINES)}"
        )
    with one_thread():
        return LINES[name](plan, error_room(plan))
