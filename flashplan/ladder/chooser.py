"""The largest ladder resistance that keeps what stays and what moves at the taps inside its room."""

from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq

from flashplan.ladder.reference import build_reference, rescaled
from flashplan.ladder.result import linearity
from flashplan.ladder.solve import solve_ladder
from flashplan.ladder.tradeoff import spoiled
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

_LOWEST, _HIGHEST = 0.1, 1e6  # ohm, all that a ladder may be built with
_SCAN = 36
# Kickback and feedthrough grow with the resistance: this far beyond their room no larger one can fit.
_HOPELESS = 4.0


@dataclass(frozen=True)
class ResistanceLimit:
    """limit in ohm, 0 where nothing fits; binding: "linearity" or "enob"; note: why nothing fits.

    effect: the one that takes most of the room that binds.
    """

    limit: float
    binding: str
    note: str = ""
    effect: str = ""


def largest_resistance(
    plan: Plan, cell: Datasheet, systematic_lsb: float, power_lsb2: float
) -> ResistanceLimit:
    """Search the resistance.

    systematic_lsb: room of max |DNL| and max |INL| of all fixed errors; power_lsb2: room of the error power of
    kickback, feedthrough and noise. Leads favour a large resistance and all else a small one, so that what fits is a
    window; its upper end is returned, to 1e-9.
    """
    base = build_reference(plan, cell, 1.0)

    def used(log_resistance: float) -> tuple[float, float]:
        """Each room's used part, at most 1 where it fits."""
        _, largest, *moving = spoiled(
            plan, cell, rescaled(base, float(np.exp(log_resistance)))
        )
        return _part(largest, systematic_lsb), _part(sum(moving), power_lsb2)

    places = np.linspace(np.log(_LOWEST), np.log(_HIGHEST), _SCAN)
    parts: list[tuple[float, float]] = []
    for place in places:
        parts.append(used(float(place)))
        if parts[-1][1] > _HOPELESS:
            break
    worst = [max(pair) for pair in parts]
    fitting = np.flatnonzero(np.array(worst) <= 1.0)
    if fitting.size == 0:
        best = int(np.argmin(worst))
        resistance, name = float(np.exp(places[best])), _name(parts[best])
        effect = _largest_effect(plan, cell, resistance, name)
        return ResistanceLimit(
            0.0,
            name,
            f"no resistance fits: at {resistance:.3g} ohm still {worst[best]:.3g} times the room, most of it {effect}",
            effect,
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
    name, limit = _name(used(root)), float(np.exp(root))
    return ResistanceLimit(limit, name, effect=_largest_effect(plan, cell, limit, name))


def _name(part: tuple[float, float]) -> str:
    return ("linearity", "enob")[int(np.argmax(part))]


def _largest_effect(
    plan: Plan, cell: Datasheet, resistance: float, binding: str
) -> str:
    if binding == "linearity":
        by_effect = linearity(solve_ladder(plan, cell, resistance))
        del by_effect["systematic"]
        return max(by_effect, key=lambda name: max(by_effect[name]))
    *_, kickback, through, noise = spoiled(
        plan, cell, build_reference(plan, cell, resistance)
    )
    moving = {"kickback": kickback, "feedthrough": through, "noise": noise}
    return max(moving, key=lambda name: moving[name])


def _part(value: float, room: float) -> float:
    return value / room if room > 0 else (0.0 if value == 0 else np.inf)
