"""The largest ladder resistance that keeps what stays and what moves at the taps inside its room."""

from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq

from flashplan.ladder.effects import tap_error_power
from flashplan.ladder.result import systematic_errors
from flashplan.ladder.solve import solve_ladder
from flashplan.metrics.linearity import dnl_inl
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

_LOWEST, _HIGHEST = 0.1, 1e6  # ohm, all that a ladder may be built with
_SCAN = 36


@dataclass(frozen=True)
class ResistanceLimit:
    """limit in ohm, 0 where nothing fits; binding: "linearity" or "enob"; note: why nothing fits."""

    limit: float
    binding: str
    note: str = ""


def largest_resistance(
    plan: Plan, cell: Datasheet, systematic_lsb: float, power_lsb2: float
) -> ResistanceLimit:
    """Search the resistance.

    systematic_lsb: room of max |DNL| and max |INL| of lead, bias and kickback; power_lsb2: room of the error power of
    kickback, feedthrough and noise. Leads favour a large resistance and all else a small one, so that what fits is a
    window; its upper end is returned, to 1e-9.
    """

    def used(log_resistance: float) -> tuple[float, float]:
        """Each room's used part, at most 1 where it fits."""
        result = solve_ladder(plan, cell, float(np.exp(log_resistance)))
        dnl, inl = dnl_inl(systematic_errors(result), plan.goals.linearity_fit)
        largest = max(np.abs(dnl).max(initial=0.0), np.abs(inl).max())
        power = tap_error_power(
            result.kickback_lsb,
            result.feedthrough_lsb,
            result.noise_sigma_lsb,
            plan.converter.bits,
        )
        return _part(float(largest), systematic_lsb), _part(power, power_lsb2)

    places = np.linspace(np.log(_LOWEST), np.log(_HIGHEST), _SCAN)
    parts = [max(used(float(place))) for place in places]
    fitting = np.flatnonzero(np.array(parts) <= 1.0)
    if fitting.size == 0:
        best = int(np.argmin(parts))
        name = ("linearity", "enob")[int(np.argmax(used(float(places[best]))))]
        return ResistanceLimit(
            0.0,
            name,
            f"no resistance fits: at {np.exp(places[best]):.3g} ohm still {parts[best]:.3g} times the room",
        )
    last = int(fitting[-1])
    if last == _SCAN - 1:
        return ResistanceLimit(_HIGHEST, "highest looked at")
    root = float(
        brentq(
            lambda place: max(used(place)) - 1.0,
            places[last],
            places[last + 1],
            xtol=1e-10,
        )
    )
    return ResistanceLimit(
        float(np.exp(root)), ("linearity", "enob")[int(np.argmax(used(root)))]
    )


def _part(value: float, room: float) -> float:
    return value / room if room > 0 else (0.0 if value == 0 else np.inf)
