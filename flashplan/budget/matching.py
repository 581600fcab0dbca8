"""Limits of random mismatch: the comparators' offset and the ladder's resistors."""

import math

from flashplan.budget.result import BudgetLine, Input
from flashplan.budget.room import RESISTOR_PART, ErrorRoom
from flashplan.errors import InputError
from flashplan.metrics.offset_limit import (
    YieldUnreachable,
    largest_mismatch_scale,
    largest_offset_sigma,
)
from flashplan.metrics.pinned_walk import walk_power
from flashplan.plan.model import Plan

_CHAIN = "exact chain of neighbouring thresholds (integral operators), solved for sigma"
_SCATTER = "error powers add, at their quantile over arrays (Kuonen 1999)"


def offset_line(plan: Plan, room: ErrorRoom) -> BudgetLine:
    """Offset of one comparator: the tighter of the yield goal and its share of the error power."""
    goals, share = plan.goals, plan.allocation.offset
    dnl, inl = _random_goals(plan)
    try:
        from_yield = largest_offset_sigma(
            plan.converter.bits,
            goals.yield_,
            dnl,
            inl,
            goals.linearity_fit,
            plan.ladder.resistor_sigma,
        )
    except YieldUnreachable as error:
        raise InputError(
            f"with this mismatch of the resistors no comparator reaches the yield of {goals.yield_:g}: {error}",
            f"{plan.source}: ladder.resistor_sigma",
        ) from None
    from_enob = math.sqrt(share * room.excess / (room.scatter * room.threshold_weight))
    candidates = {"yield": from_yield * plan.lsb, "enob": from_enob * plan.lsb}
    binding = min(candidates, key=lambda name: candidates[name])
    return BudgetLine(
        "offset_sigma",
        candidates[binding],
        "V",
        "min(sigma with P(|DNL| <= dnl - systematic and |INL| <= inl - systematic) = yield;"
        " LSB sqrt(share excess / (scatter sum w)))",
        f"yield: {_CHAIN}; ENOB: {_SCATTER}",
        {
            **_linearity_inputs(plan),
            "ladder.resistor_sigma": Input(plan.ladder.resistor_sigma),
            "goals.enob": Input(goals.enob),
            "allocation.offset": Input(share),
            **room.inputs(),
            "scatter": Input(room.scatter),
            "sum w": Input(room.threshold_weight),
        },
        share,
        candidates,
        binding,
    )


def resistor_line(plan: Plan, room: ErrorRoom) -> BudgetLine:
    """Relative sigma of one unit resistor: the tighter of the yield goal, which it splits with the offset, and its
    part of the ladder's share of the error power."""
    goals, share = plan.goals, plan.allocation
    bits = plan.converter.bits
    dnl, inl = _random_goals(plan)
    part = RESISTOR_PART * share.ladder
    # A walk pinned at both ends is widest at the middle, sqrt(segments)/2 units of one resistor's sigma.
    per_middle_tap = 2.0 / math.sqrt(2**bits)
    # Without a share for the offset there is still some: a thousandth of the resistors' part is as good as none.
    offset_part = math.sqrt(max(share.offset, 1e-6 * part, 1e-12))
    scale = largest_mismatch_scale(
        bits,
        goals.yield_,
        dnl,
        inl,
        goals.linearity_fit,
        offset_part=offset_part,
        resistor_part=math.sqrt(part) * per_middle_tap,
    )
    power = walk_power(bits)
    candidates = {
        "yield": scale * math.sqrt(part) * per_middle_tap,
        "enob": math.sqrt(part * room.excess / (room.scatter * power)),
    }
    binding = min(candidates, key=lambda name: candidates[name])
    return BudgetLine(
        "resistor_sigma",
        candidates[binding],
        "ratio",
        "min(sigma that with offsets in the ratio of the shares just meets the yield;"
        " sqrt(share/2 excess / (scatter sum(w k (m - k) / m))))",
        f"yield: {_CHAIN}; tap sigma s sqrt(k (m - k) / m), a random walk with pinned ends; ENOB: {_SCATTER}",
        {
            **_linearity_inputs(plan),
            "allocation.offset": Input(share.offset),
            "goals.enob": Input(goals.enob),
            "allocation.ladder": Input(share.ladder),
            **room.inputs(),
            "scatter": Input(room.scatter),
            "sum(w k (m - k) / m)": Input(power),
        },
        part,
        candidates,
        binding,
    )


def _random_goals(plan: Plan) -> tuple[float, float]:
    """What the goals leave to random errors, in LSB."""
    systematic = plan.allocation.systematic_lsb
    return plan.goals.dnl_lsb - systematic, plan.goals.inl_lsb - systematic


def _linearity_inputs(plan: Plan) -> dict[str, Input]:
    goals = plan.goals
    return {
        "converter.bits": Input(plan.converter.bits),
        "converter.full_scale": Input(plan.converter.full_scale, "V"),
        "goals.yield": Input(goals.yield_),
        "goals.dnl_lsb": Input(goals.dnl_lsb, "lsb"),
        "goals.inl_lsb": Input(goals.inl_lsb, "lsb"),
        "goals.linearity_fit": Input(goals.linearity_fit),
        "allocation.systematic_lsb": Input(plan.allocation.systematic_lsb, "lsb"),
    }
