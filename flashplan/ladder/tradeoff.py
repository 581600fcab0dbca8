"""What a ladder costs and spoils against its resistance."""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.ladder.effects import (
    feedthrough_phasor,
    heat,
    noise_sigma,
    rest_voltages,
    tap_error_power,
)
from flashplan.ladder.kickback import lasting_modes, residue_at_rest
from flashplan.ladder.reference import Reference, build_reference, rescaled
from flashplan.ladder.result import largest_dnl_inl
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class TradeOff:
    """Arrays (r,), one entry for each resistance.

    total_resistance in ohm, power in W. systematic_lsb: largest of |DNL| and |INL| of all fixed errors. kickback_lsb2,
    feedthrough_lsb2, noise_lsb2: error power of each under a full-scale sine; 0 where the cell does not give it.
    """

    total_resistance: Floats
    power: Floats
    systematic_lsb: Floats
    kickback_lsb2: Floats
    feedthrough_lsb2: Floats
    noise_lsb2: Floats

    def to_dict(self) -> dict[str, list[float]]:
        """Plain lists by name."""
        return {name: values.tolist() for name, values in vars(self).items()}


def trade_off(plan: Plan, cell: Datasheet, resistances: Iterable[float]) -> TradeOff:
    """Work out the plan's ladder at several total resistances, in ohm."""
    values = list(resistances)
    base = build_reference(plan, cell, values[0])
    points = [spoiled(plan, cell, rescaled(base, value)) for value in values]
    return TradeOff(np.array(values), *np.array(points).T)


def spoiled(plan: Plan, cell: Datasheet, reference: Reference) -> tuple[float, ...]:
    """Power, systematic_lsb, kickback_lsb2, feedthrough_lsb2 and noise_lsb2 of one ladder, as in `TradeOff`."""
    bits, lsb = plan.converter.bits, plan.lsb
    fixed = rest_voltages(reference) / lsb - np.arange(1, plan.comparators + 1)
    kickback = through = None
    if cell.kickback_charge is not None:
        period = 1.0 / plan.converter.sample_rate
        kickback = residue_at_rest(
            reference, lasting_modes(reference, period), period
        ) * (cell.kickback_charge / lsb)
        fixed = fixed + kickback
    if cell.coupling_capacitance is not None:
        amplitude = plan.converter.full_scale / 2 / lsb
        frequency = plan.converter.input_frequency
        through = feedthrough_phasor(reference, frequency, amplitude)[0]
    return (
        heat(reference.network),
        max(largest_dnl_inl(fixed, plan.goals.linearity_fit)),
        tap_error_power(kickback, None, None, bits),
        tap_error_power(None, through, None, bits),
        tap_error_power(None, None, noise_sigma(reference) / lsb, bits),
    )
