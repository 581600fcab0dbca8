"""The error power that a plan may add to quantisation, and how much of it an array's own scatter takes."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.budget.result import Input
from flashplan.errors import InputError
from flashplan.metrics.ideal import (
    ideal_error_power_lsb2,
    ideal_sndr_db,
    sndr_from_enob,
)
from flashplan.metrics.pinned_walk import walk_spectrum
from flashplan.metrics.quadratic_form import quadratic_form_quantile
from flashplan.metrics.sine import sine_slews, sine_weights
from flashplan.plan.model import Plan


@dataclass(frozen=True)
class ErrorRoom:
    """Error power in LSB^2 about the fitted sine.

    ideal: of the ideal quantiser; allowed: by the ENOB goal after input droop; excess: the difference, to be shared.
    scatter: quantile over mean of the errors that are drawn once per array, at the plan's yield.
    threshold_weight: error power per LSB^2 of a random threshold error; timing_weight: per s^2 of a timing error.
    """

    ideal: float
    allowed: float
    excess: float
    scatter: float
    threshold_weight: float
    timing_weight: float

    def inputs(self) -> dict[str, Input]:
        """The values that every shared limit hangs on."""
        return {
            "ideal error power": Input(self.ideal, "LSB^2"),
            "allowed error power": Input(self.allowed, "LSB^2"),
            "excess": Input(self.excess, "LSB^2"),
        }


def error_room(plan: Plan) -> ErrorRoom:
    """Work out the error power that the plan's ENOB goal leaves beyond quantisation.

    allowed = signal 10**(-(SNDR_goal + droop) / 10), with the signal and the ideal error power of an ideal quantiser
    measured with a fitted full-scale sine. Raises InputError when the goal is at or above what that quantiser reaches.
    Source: error powers of independent sources add; exact quantiser of `flashplan.metrics.ideal`.
    """
    converter, goals = plan.converter, plan.goals
    ideal = ideal_error_power_lsb2(converter.bits)
    ceiling = ideal_sndr_db(converter.bits)
    droop = (
        plan.allocation.input_droop_db
        if converter.source_resistance is not None
        else 0.0
    )
    allowed = ideal * 10 ** ((ceiling - droop - sndr_from_enob(goals.enob)) / 10)
    if allowed <= ideal:
        reach = goals.enob + 10 * np.log10(allowed / ideal) / (20 * np.log10(2))
        raise InputError(
            f"{goals.enob:g} effective bits leave no room for any error: an ideal {converter.bits}-bit converter measured"
            f" with a fitted full-scale sine reaches {reach:.3f}"
            + (f" after {droop:g} dB of input droop" if droop else ""),
            f"{plan.source}: goals.enob",
        )
    weights = sine_weights(converter.bits)
    slews = (
        sine_slews(
            converter.bits, plan.lsb * 2**converter.bits, converter.input_frequency
        )
        / plan.lsb
    )
    return ErrorRoom(
        ideal=ideal,
        allowed=allowed,
        excess=allowed - ideal,
        scatter=_scatter(plan, weights, weights * slews**2),
        threshold_weight=float(weights.sum()),
        timing_weight=float((weights * slews**2).sum()),
    )


def _scatter(
    plan: Plan, offset_weights: NDArray[np.float64], skew_weights: NDArray[np.float64]
) -> float:
    share = plan.allocation
    parts = [
        share.offset * offset_weights / offset_weights.sum(),
        share.skew * skew_weights / skew_weights.sum(),
        share.ladder * RESISTOR_PART * walk_spectrum(plan.converter.bits),
    ]
    weights = np.concatenate(parts)
    mean = weights.sum()
    return (
        quadratic_form_quantile(plan.goals.yield_, weights) / mean if mean > 0 else 1.0
    )


# The ladder's share is split evenly between what is drawn once (resistors) and what moves (kickback, feedthrough, noise).
RESISTOR_PART = 0.5
