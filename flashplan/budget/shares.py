"""Limits that a share of the error power sets: noise, hysteresis, skew and jitter."""

import math

from flashplan.budget.result import BudgetLine, Input
from flashplan.budget.room import ErrorRoom
from flashplan.plan.model import Plan

_RULE = "independent error powers add; a threshold moved by e adds w e^2, w by the density of a sine (Bennett 1948)"


def noise_limit(error_power: float, threshold_weight: float) -> float:
    """Largest noise sigma in LSB: sigma = sqrt(P / sum w).

    error_power: P in LSB^2; threshold_weight: sum of the sine's weights.

    >>> print(f"{noise_limit(0.01, 1.0):.3f}")
    0.100
    """
    return math.sqrt(error_power / threshold_weight)


def hysteresis_limit(error_power: float, threshold_weight: float) -> float:
    """Largest hysteresis, full width in LSB: width = 2 sqrt(P / sum w), since each decision is off by half the width.

    >>> print(f"{hysteresis_limit(0.01, 1.0):.3f}")
    0.200
    """
    return 2.0 * math.sqrt(error_power / threshold_weight)


def timing_limit(error_power: float, timing_weight: float) -> float:
    """Largest sigma of a timing error, in s: sigma_t = sqrt(P / sum(w slew^2)).

    error_power: P in LSB^2; timing_weight: in LSB^2/s^2, (2 pi f A)^2 / 2 for many bits.
    """
    return math.sqrt(error_power / timing_weight)


def noise_line(plan: Plan, room: ErrorRoom) -> BudgetLine:
    """Input-referred noise of one comparator, drawn anew at each decision."""
    share = plan.allocation.noise
    limit = noise_limit(share * room.excess, room.threshold_weight) * plan.lsb
    return BudgetLine(
        "noise_sigma",
        limit,
        "V",
        "LSB sqrt(share excess / sum w)",
        _RULE,
        {
            **_goal(plan),
            "allocation.noise": Input(share),
            **room.inputs(),
            "sum w": Input(room.threshold_weight),
        },
        share,
    )


def hysteresis_line(plan: Plan, room: ErrorRoom) -> BudgetLine:
    """Full width between the trip points of one comparator."""
    share = plan.allocation.hysteresis
    limit = hysteresis_limit(share * room.excess, room.threshold_weight) * plan.lsb
    return BudgetLine(
        "hysteresis",
        limit,
        "V",
        "2 LSB sqrt(share excess / sum w)",
        _RULE,
        {
            **_goal(plan),
            "allocation.hysteresis": Input(share),
            **room.inputs(),
            "sum w": Input(room.threshold_weight),
        },
        share,
        note="an upper bound: a slow sine loses most of this error to the fitted phase",
    )


def skew_line(plan: Plan, room: ErrorRoom) -> BudgetLine:
    """Sampling instant of one comparator against the array's mean, drawn once per array."""
    share = plan.allocation.skew
    limit = timing_limit(share * room.excess / room.scatter, room.timing_weight)
    return BudgetLine(
        "skew_sigma",
        limit,
        "s",
        "sqrt(share excess / (scatter sum(w slew^2)))",
        _RULE + "; quantile over arrays of a sum of squares (Kuonen 1999)",
        {
            **_goal(plan),
            "goals.yield": Input(plan.goals.yield_),
            "converter.input_frequency": Input(plan.converter.input_frequency, "Hz"),
            "allocation.skew": Input(share),
            **room.inputs(),
            "scatter": Input(room.scatter),
            "sum(w slew^2)": Input(room.timing_weight, "LSB^2/s^2"),
        },
        share,
    )


def jitter_line(plan: Plan, room: ErrorRoom) -> BudgetLine:
    """Jitter of the sampling clock, common to all comparators."""
    share = plan.allocation.jitter
    limit = timing_limit(share * room.excess, room.timing_weight)
    return BudgetLine(
        "jitter_sigma",
        limit,
        "s",
        "sqrt(share excess / sum(w slew^2)), sum(w slew^2) ~ (2 pi f A)^2 / 2",
        _RULE,
        {
            **_goal(plan),
            "converter.input_frequency": Input(plan.converter.input_frequency, "Hz"),
            "allocation.jitter": Input(share),
            **room.inputs(),
            "sum(w slew^2)": Input(room.timing_weight, "LSB^2/s^2"),
        },
        share,
    )


def _goal(plan: Plan) -> dict[str, Input]:
    return {
        "goals.enob": Input(plan.goals.enob),
        "converter.full_scale": Input(plan.converter.full_scale, "V"),
        "converter.bits": Input(plan.converter.bits),
    }
