"""Limits of time: the delay before regeneration starts and the time constant that must finish it."""

import math

from flashplan.budget.result import BudgetLine, Input
from flashplan.plan.model import Plan


def decision_time(plan: Plan) -> float:
    """Time in which a comparator may decide, in s: decision_fraction / sample_rate."""
    return plan.converter.decision_fraction / plan.converter.sample_rate


def delay_limit(plan: Plan) -> float:
    """Longest delay before regeneration starts, in s."""
    return plan.allocation.delay_fraction * decision_time(plan)


def regeneration_time(plan: Plan, delay: float) -> float:
    """Time left to regenerate after `delay`, in s, with one more clock period for each pipelined latch."""
    return (
        decision_time(plan)
        - delay
        + plan.converter.latch_stages / plan.converter.sample_rate
    )


def valid_level(plan: Plan) -> float:
    """Differential output below which a decision counts as undecided, in V: half the supply."""
    return plan.converter.supply / 2


def undecided_rate(
    time: float, tau: float, gain: float, level: float, lsb: float
) -> float:
    """Part of conversions in which a comparator is still below the valid level after `time`.

    P = 2 V / (A0 LSB) exp(-t / tau), at most 1, with the input spread evenly over an LSB: only the comparator nearest
    to the input matters, so the number of comparators does not enter. time, tau in s; level V and lsb in V.
    Source: H. J. M. Veendrick, "The behavior of flip-flops used as synchronizers and prediction of their failure rate",
    IEEE J. Solid-State Circuits 15(2), 1980 (memory).

    >>> print(f"{undecided_rate(400e-12, 15e-12, 4, 0.5, 10e-3):.4e}")
    6.5577e-11
    """
    return math.exp(min(0.0, math.log(2 * level / (gain * lsb)) - time / tau))


def tau_limit(time: float, rate: float, gain: float, level: float, lsb: float) -> float:
    """Largest regeneration time constant that keeps to an undecided rate, in s: t / ln(2 V / (A0 LSB rate)).

    Infinite where even the first instant keeps to it. Inverse of `undecided_rate`, same inputs and source.
    """
    exponent = math.log(2 * level / (gain * lsb * rate))
    return time / exponent if exponent > 0 else math.inf


def tau_line(plan: Plan) -> BudgetLine:
    """Regeneration time constant from the word error goal, with the delay at its own limit."""
    own_gain = plan.datasheet.regeneration_gain
    gain = 1.0 if own_gain is None else own_gain
    time = regeneration_time(plan, delay_limit(plan))
    limit = tau_limit(
        time, plan.goals.word_error_rate, gain, valid_level(plan), plan.lsb
    )
    gain_from = (
        "assumed: the cell does not give one" if own_gain is None else "the plan's cell"
    )
    unlimited = math.isinf(limit)
    return BudgetLine(
        "regeneration_tau",
        None if unlimited else limit,
        "s",
        "t / ln(2 V / (A0 LSB rate)), t = (1 - delay_fraction) decision_fraction / sample_rate + latch_stages / sample_rate, V = supply / 2",
        "exponential regeneration of a latch (H. J. M. Veendrick 1980, memory)",
        {
            "goals.word_error_rate": Input(plan.goals.word_error_rate),
            "converter.sample_rate": Input(plan.converter.sample_rate, "Hz"),
            "converter.decision_fraction": Input(plan.converter.decision_fraction),
            "converter.latch_stages": Input(plan.converter.latch_stages),
            "converter.supply": Input(plan.converter.supply, "V"),
            "converter.full_scale": Input(plan.converter.full_scale, "V"),
            "converter.bits": Input(plan.converter.bits),
            "allocation.delay_fraction": Input(plan.allocation.delay_fraction),
            "time to regenerate": Input(time, "s"),
            "regeneration_gain": Input(gain),
        },
        note=f"regeneration_gain {gain:g} is {gain_from}"
        + ("; the goal is met before any regeneration" if unlimited else ""),
    )


def delay_line(plan: Plan) -> BudgetLine:
    """Delay from the clock edge to the start of regeneration."""
    return BudgetLine(
        "delay",
        delay_limit(plan),
        "s",
        "delay_fraction decision_fraction / sample_rate",
        "the plan's own allocation of the decision time",
        {
            "allocation.delay_fraction": Input(plan.allocation.delay_fraction),
            "converter.decision_fraction": Input(plan.converter.decision_fraction),
            "converter.sample_rate": Input(plan.converter.sample_rate, "Hz"),
        },
    )
