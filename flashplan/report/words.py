"""What results say in plain words, the same in the terminal and on the page."""

from dataclasses import dataclass

import numpy as np

from flashplan.array.result import ArrayResult
from flashplan.budget.result import BudgetLine
from flashplan.cell.check import TAKEN, Verdict, VerdictLine
from flashplan.ladder import LadderResult, effects
from flashplan.plan.model import Plan
from flashplan.quantity import show

CAUTION = "A planning estimate from behavioural models, not a sign-off: confirm with foundry-qualified verification."

_BINDING = {
    "yield": "yield goal",
    "enob": "ENOB goal",
    "linearity": "systematic_lsb",
}


@dataclass(frozen=True)
class GoalRow:
    """One goal of the plan: what was asked, what was reached, and the verdict."""

    name: str
    asked: str
    reached: str
    met: bool | None


def goal_rows(plan: Plan, result: ArrayResult) -> list[GoalRow]:
    """The three goals, in the order of the plan."""
    goals, met = plan.goals, result.goals_met
    static, dynamic = result.static, result.dynamic
    return [
        GoalRow(
            f"linearity ({goals.linearity_fit} line)",
            f"{goals.yield_:.6g} of arrays within {goals.dnl_lsb:g}/{goals.inl_lsb:g} LSB DNL/INL",
            "not known" if static is None else f"{static.exact_yield:.6g} of arrays",
            met["linearity"],
        ),
        GoalRow(
            "effective bits",
            f"{goals.enob:g} in {goals.yield_:.6g} of arrays at {show(plan.converter.input_frequency, 'Hz')}",
            "not known" if dynamic is None else f"{dynamic.enob_low:.3f}",
            met["enob"],
        ),
        GoalRow(
            "word error rate",
            f"{goals.word_error_rate:.3g} per conversion",
            "not known"
            if result.word_error_rate is None
            else f"{result.word_error_rate:.3g}",
            met["word_error_rate"],
        ),
    ]


def headline(plan: Plan, result: ArrayResult) -> str:
    """One sentence: are the goals met, and which are not."""
    missed = [row.name for row in goal_rows(plan, result) if row.met is False]
    unknown = [row.name for row in goal_rows(plan, result) if row.met is None]
    name = plan.converter.name
    if missed:
        return f"{name}: MISSES {' and '.join(missed)}."
    if unknown:
        return (
            f"{name}: no goal is missed, but {' and '.join(unknown)} cannot be judged."
        )
    return f"{name}: all goals are met."


def tightest(verdict: Verdict) -> VerdictLine | None:
    """The judged line with the least margin."""
    judged = [
        line
        for line in verdict.lines.values()
        if line.margin is not None and line.note != TAKEN
    ]
    return min(judged, key=lambda line: line.margin or 0.0, default=None)


def verdict_sentence(verdict: Verdict) -> str:
    """Are all limits kept, what is tightest, what could not be judged."""
    broken = [line for line in verdict.lines.values() if line.met is False]
    unknown = [
        line.name
        for line in verdict.lines.values()
        if line.met is None and line.limit is not None
    ]
    least = tightest(verdict)
    if broken:
        worst = min(broken, key=lambda line: line.margin or 0.0)
        text = f"{len(broken)} of {len(verdict.lines)} limits broken; worst is {worst.name}, {_over(worst)}."
    elif least is not None:
        text = f"No limit broken; the tightest is {least.name} with {least.margin:.1%} to spare."
    else:
        text = "Nothing could be judged."
    if unknown:
        text += (
            f" Not judged, since the datasheet does not give it: {', '.join(unknown)}."
        )
    return text


def ladder_sentence(result: LadderResult) -> str:
    """Resistance, power and the effect that moves a tap most."""
    known = {
        name: float(np.abs(errors).max())
        for name, errors in effects(result).items()
        if errors is not None
    }
    worst = max(known, key=lambda name: known[name])
    return (
        f"{show(result.total_resistance, 'ohm')} in total, {show(result.power, 'W')} of reference power;"
        f" most moved by {worst}, up to {known[worst]:.3g} LSB."
    )


# The lines that can break each goal.
_BEHIND = {
    "linearity": (
        "offset_sigma",
        "resistor_sigma",
        "kickback_charge",
        "ladder_resistance",
    ),
    "enob": (
        "offset_sigma",
        "noise_sigma",
        "hysteresis",
        "skew_sigma",
        "jitter_sigma",
        "kickback_charge",
        "ladder_resistance",
        "resistor_sigma",
        "input_capacitance",
    ),
    "word_error_rate": ("regeneration_tau", "delay"),
}


def reasons(result: ArrayResult, verdict: Verdict) -> list[str]:
    """Why each missed goal is missed, by the broken limits behind it; or why broken limits did no harm."""
    found = []
    for goal, met in result.goals_met.items():
        if met is not False:
            continue
        broken = [
            verdict.lines[name]
            for name in _BEHIND[goal]
            if verdict.lines[name].met is False
        ]
        broken.sort(key=lambda line: line.margin or 0.0)
        in_the_way = ", ".join(f"{line.name} ({_over(line)})" for line in broken)
        found.append(
            f"In the way of {_GOAL_WORDS[goal]}: {in_the_way or 'no single limit, but their sum'}."
        )
    if (
        not found
        and None not in result.goals_met.values()
        and any(line.met is False for line in verdict.lines.values())
    ):
        found.append(
            "The goals are met all the same: a limit is what is safe while all others are used up,"
            " and here others leave room."
        )
    return found


_GOAL_WORDS = {
    "linearity": "linearity",
    "enob": "effective bits",
    "word_error_rate": "the word error rate",
}


def _over(line: VerdictLine) -> str:
    return f"{show(line.value, line.unit)} against {show(line.limit, line.unit)}"


def line_origin(line: BudgetLine) -> str:
    """Short word for what sets a limit."""
    if line.binding:
        return _BINDING.get(line.binding, line.binding)
    if line.limit is None:
        return "nothing given"
    return {
        "regeneration_tau": "word error goal",
        "delay": "delay_fraction",
        "input_capacitance": "input_droop_db",
    }.get(line.name, "ENOB goal")
