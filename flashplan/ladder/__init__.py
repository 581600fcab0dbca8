"""The reference network: a graph of parts, its matrices, and the error at each tap."""

from flashplan.ladder.chooser import ResistanceLimit, largest_resistance
from flashplan.ladder.effects import tap_error_power
from flashplan.ladder.kickback import kickback_per_charge
from flashplan.ladder.result import LadderResult, effects, systematic_errors
from flashplan.ladder.solve import solve_ladder

__all__ = [
    "LadderResult",
    "ResistanceLimit",
    "effects",
    "kickback_per_charge",
    "largest_resistance",
    "solve_ladder",
    "systematic_errors",
    "tap_error_power",
]
