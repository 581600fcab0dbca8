"""What the ladder room hands on."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class LadderResult:
    """The solved ladder; arrays are (M,), errors in LSB, positive where a tap is too high.

    taps: voltage of each tap at rest with leads, bias and kickback. feedthrough_lsb: phasor against a full-scale sine at
    input_frequency. kickback_lsb, feedthrough_lsb: None where the cell does not give what they need. power in W.
    """

    total_resistance: float
    taps: Floats
    lead_lsb: Floats
    bias_lsb: Floats
    kickback_lsb: Floats | None
    feedthrough_lsb: NDArray[np.complex128] | None
    mismatch_sigma_lsb: Floats
    noise_sigma_lsb: Floats
    power: float

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `ladder`."""
        through = self.feedthrough_lsb
        return {
            "total_resistance": self.total_resistance,
            "power": self.power,
            "taps": self.taps.tolist(),
            "errors_lsb": {
                "lead": self.lead_lsb.tolist(),
                "bias": self.bias_lsb.tolist(),
                "kickback": None
                if self.kickback_lsb is None
                else self.kickback_lsb.tolist(),
                "feedthrough": None if through is None else np.abs(through).tolist(),
            },
            "feedthrough_phase_rad": None
            if through is None
            else np.angle(through).tolist(),
            "mismatch_sigma_lsb": self.mismatch_sigma_lsb.tolist(),
            "noise_sigma_lsb": self.noise_sigma_lsb.tolist(),
        }


def systematic_errors(result: LadderResult) -> Floats:
    """Fixed error of each threshold in LSB: lead, bias, and kickback where it is known."""
    fixed = result.lead_lsb + result.bias_lsb
    return fixed if result.kickback_lsb is None else fixed + result.kickback_lsb


def effects(result: LadderResult) -> dict[str, Floats | None]:
    """Each effect by name: errors in LSB, amplitude or sigma where it moves or scatters."""
    through = result.feedthrough_lsb
    return {
        "lead": result.lead_lsb,
        "bias": result.bias_lsb,
        "kickback": result.kickback_lsb,
        "feedthrough": None if through is None else np.abs(through),
        "mismatch": result.mismatch_sigma_lsb,
        "noise": result.noise_sigma_lsb,
    }
