"""Plan the comparator array of a flash A/D converter: limits, ladder, cell, array, decoder, report.

The names below are the public API, in the order a designer uses them; each is loaded when first used, so that
importing the package costs nothing.
"""

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from flashplan.budget.at_limits import plan_at_limits
    from flashplan.budget.derive import derive_budget
    from flashplan.budget.explain import explain_line
    from flashplan.cell.check import check_cell
    from flashplan.chain import (
        compare_decoders,
        measure_codes,
        simulate_array,
        solve_ladder,
    )
    from flashplan.decoder import decode
    from flashplan.errors import InputError
    from flashplan.plan.load import load_cell, load_plan
    from flashplan.report.write import write_report
    from flashplan.sweep import run_sweep

_HOMES = {
    "load_plan": "flashplan.plan.load",
    "derive_budget": "flashplan.budget.derive",
    "explain_line": "flashplan.budget.explain",
    "plan_at_limits": "flashplan.budget.at_limits",
    "solve_ladder": "flashplan.chain",
    "load_cell": "flashplan.plan.load",
    "size_cell": "flashplan.chain",
    "check_cell": "flashplan.cell.check",
    "simulate_array": "flashplan.chain",
    "compare_decoders": "flashplan.chain",
    "measure_codes": "flashplan.chain",
    "run_sweep": "flashplan.sweep",
    "write_report": "flashplan.report.write",
    "decode": "flashplan.decoder",
    "InputError": "flashplan.errors",
}

__all__ = [
    "InputError",
    "check_cell",
    "compare_decoders",
    "decode",
    "derive_budget",
    "explain_line",
    "load_cell",
    "load_plan",
    "measure_codes",
    "plan_at_limits",
    "run_sweep",
    "simulate_array",
    "size_cell",
    "solve_ladder",
    "write_report",
]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'flashplan' has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)
