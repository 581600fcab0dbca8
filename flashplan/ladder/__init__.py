"""The reference network: a graph of parts, its matrices, and the error at each tap."""

from flashplan.ladder.chooser import ResistanceLimit, largest_resistance
from flashplan.ladder.effects import tap_error_power
from flashplan.ladder.kickback import kickback_per_charge
from flashplan.ladder.memory import KickbackMemory, disturbance, kickback_memory
from flashplan.ladder.mismatch import mismatch_covariance
from flashplan.ladder.result import (
    LadderResult,
    effects,
    linearity,
    rest_errors_lsb,
    systematic_errors,
)
from flashplan.ladder.solve import solve_ladder
from flashplan.ladder.tradeoff import TradeOff, trade_off

__all__ = [
    "KickbackMemory",
    "LadderResult",
    "ResistanceLimit",
    "TradeOff",
    "disturbance",
    "effects",
    "kickback_memory",
    "kickback_per_charge",
    "largest_resistance",
    "linearity",
    "mismatch_covariance",
    "rest_errors_lsb",
    "solve_ladder",
    "systematic_errors",
    "tap_error_power",
    "trade_off",
]
