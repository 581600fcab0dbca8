"""The limit that the signal source sets: how much capacitance each comparator may hang on it."""

import math

from flashplan.budget.result import BudgetLine, Input
from flashplan.plan.model import Plan


def input_droop(frequency: float, resistance: float, capacitance: float) -> float:
    """Power ratio of the input at the comparators to the source, 1 / (1 + (2 pi f R C)^2).

    frequency in Hz, source resistance in ohm, capacitance of all comparators together in F.
    """
    return 1.0 / (1.0 + (2.0 * math.pi * frequency * resistance * capacitance) ** 2)


def input_capacitance_line(plan: Plan) -> BudgetLine:
    """Input capacitance of one comparator from the droop at the highest input frequency."""
    converter, droop = plan.converter, plan.allocation.input_droop_db
    resistance = converter.source_resistance
    limit, note = (
        None,
        "the plan gives no converter.source_resistance, so nothing limits it",
    )
    inputs = {
        "allocation.input_droop_db": Input(droop, "db"),
        "converter.input_frequency": Input(converter.input_frequency, "Hz"),
        "comparators": Input(plan.comparators),
    }
    if resistance is not None:
        pole = 2.0 * math.pi * converter.input_frequency * resistance * plan.comparators
        limit, note = math.sqrt(10 ** (droop / 10) - 1.0) / pole, ""
        inputs["converter.source_resistance"] = Input(resistance, "ohm")
    return BudgetLine(
        "input_capacitance",
        limit,
        "F",
        "sqrt(10^(droop / 10) - 1) / (2 pi f R_source comparators)",
        "one-pole low-pass of the source and all comparator inputs",
        inputs,
        note=note,
    )
