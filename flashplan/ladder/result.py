"""What the ladder room hands on."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from flashplan.metrics.linearity import Fit, dnl_inl

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class LadderResult:
    """The solved ladder; arrays are (M,), errors in LSB, positive where a tap is too high.

    taps: thresholds in V at rest with all that is fixed, kickback included. lead, bias, gradient, turns: errors at rest
    that add. kickback_lsb: input resting at each threshold. feedthrough_lsb: phasor against a full-scale sine at
    input_frequency. recovery_time: in s, after a step from end to end. kickback_lsb, recovery_time and feedthrough_lsb
    are None where the cell does not give what they need. power: in W, turned to heat in the resistors at rest.
    fit: the line that `linearity` is taken from.
    """

    total_resistance: float
    taps: Floats
    lead_lsb: Floats
    bias_lsb: Floats
    gradient_lsb: Floats
    turns_lsb: Floats
    kickback_lsb: Floats | None
    feedthrough_lsb: NDArray[np.complex128] | None
    mismatch_sigma_lsb: Floats
    noise_sigma_lsb: Floats
    recovery_time: float | None
    power: float
    fit: Fit = "endpoint"

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `ladder`."""
        through = self.feedthrough_lsb
        errors = {
            name: None if values is None else values.tolist()
            for name, values in effects(self).items()
            if name not in ("mismatch", "noise")
        }
        return {
            "total_resistance": self.total_resistance,
            "power": self.power,
            "recovery_time": self.recovery_time,
            "taps": self.taps.tolist(),
            "errors_lsb": errors,
            "feedthrough_phase_rad": None
            if through is None
            else np.angle(through).tolist(),
            "mismatch_sigma_lsb": self.mismatch_sigma_lsb.tolist(),
            "noise_sigma_lsb": self.noise_sigma_lsb.tolist(),
            "linearity_fit": self.fit,
            "linearity_lsb": {
                name: {"dnl": dnl, "inl": inl}
                for name, (dnl, inl) in linearity(self).items()
            },
        }


def rest_errors_lsb(result: LadderResult) -> Floats:
    """Fixed error of each threshold in LSB with no clock running: all but kickback."""
    return result.lead_lsb + result.bias_lsb + result.gradient_lsb + result.turns_lsb


def systematic_errors(result: LadderResult) -> Floats:
    """Fixed error of each threshold in LSB: lead, bias, gradient, turns, and kickback at rest where it is known."""
    fixed = rest_errors_lsb(result)
    return fixed if result.kickback_lsb is None else fixed + result.kickback_lsb


def effects(result: LadderResult) -> dict[str, Floats | None]:
    """Each effect by name: errors in LSB, amplitude or sigma where it moves or scatters."""
    through = result.feedthrough_lsb
    return {
        "lead": result.lead_lsb,
        "bias": result.bias_lsb,
        "gradient": result.gradient_lsb,
        "turns": result.turns_lsb,
        "kickback": result.kickback_lsb,
        "feedthrough": None if through is None else np.abs(through),
        "mismatch": result.mismatch_sigma_lsb,
        "noise": result.noise_sigma_lsb,
    }


def linearity(result: LadderResult) -> dict[str, tuple[float, float]]:
    """Largest |DNL| and |INL| in LSB of each fixed effect that is known, and of all together ("systematic")."""
    fixed = {
        name: values
        for name, values in effects(result).items()
        if name in ("lead", "bias", "gradient", "turns", "kickback")
    }
    fixed["systematic"] = systematic_errors(result)
    return {
        name: largest_dnl_inl(values, result.fit)
        for name, values in fixed.items()
        if values is not None
    }


def largest_dnl_inl(errors: Floats, fit: Fit) -> tuple[float, float]:
    """Largest |DNL| and |INL| of some thresholds' errors (M,), in LSB."""
    dnl, inl = dnl_inl(errors, fit)
    return float(np.abs(dnl).max(initial=0.0)), float(np.abs(inl).max())
