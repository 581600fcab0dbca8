"""The sine behind a record of codes: found, fitted, and refused where it is missing, clipped, too small or too slow."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.signal.windows import blackmanharris

from flashplan.errors import InputError
from flashplan.measure.crossings import balance
from flashplan.metrics.ideal import ideal_sndr_db

Floats = NDArray[np.float64]

_FEWEST_CYCLES = 5
_PHASES_PER_CODE = 4  # samples of different phase for each code, on average
_MOST_OVERDRIVE_LSB = 0.5
# A triangle fits a sine with 18 dB, a square or a ramp with less; an ideal converter of few bits is not far above.
_LEAST_SNDR_DB = 25.0
_MOST_LOSS_DB = 18.0


@dataclass(frozen=True)
class FoundSine:
    """The input that a record's codes show, and the codes' own fundamental.

    cycles: in the record, in the first Nyquist zone; coherent: whether they are whole, as far as the record tells.
    amplitude, middle: of the input, in LSB, from the line that fits all thresholds best; phase: (n,) in rad.
    fundamental: (n,) the sine that fits the codes best; level: (M,) measured thresholds in LSB of that input.
    """

    cycles: float
    coherent: bool
    amplitude: float
    middle: float
    phase: Floats
    fundamental: Floats
    level: Floats

    @property
    def value(self) -> Floats:
        """The input at each sample, in LSB."""
        return self.middle + self.amplitude * np.sin(self.phase)


def find_sine(
    codes: NDArray[np.int64], zeros: NDArray[np.int64], bits: int
) -> FoundSine:
    """Fit the sine; codes: (n,); zeros: (2**bits - 1,) how often each comparator decided 0.

    Raises InputError for a record without a sine, of fewer than five cycles or of too few phases, and for a sine that
    overdrives the range or fills less than half of it.
    Source: IEEE Std 1241-2010, four-parameter sine fit (memory).
    """
    count = codes.size
    if np.ptp(codes) == 0:
        raise InputError(f"every sample holds code {codes[0]}; a sine is needed")
    cycles, error = _four_parameters(codes.astype(float))
    if cycles < _FEWEST_CYCLES - max(3 * error, 1e-3):
        raise InputError(
            f"holds {cycles:.3g} cycles of its largest sine; at least {_FEWEST_CYCLES} are needed "
            "(a ramp or a drift shows so too)"
        )
    coherent = abs(cycles - round(cycles)) < min(3 * error, 0.02)
    phases = count
    if coherent:
        cycles = float(round(cycles))
        phases = count // int(np.gcd(int(cycles), count))
    if phases < _PHASES_PER_CODE * 2**bits:
        raise InputError(
            f"visits {phases} different phases of the sine; {bits} bits need at least {_PHASES_PER_CODE * 2**bits} "
            "(more samples, or cycles that share no factor with them)"
        )
    fit, phase = _three_parameters(codes.astype(float), cycles)
    fundamental = fit[2] + float(np.hypot(fit[0], fit[1])) * np.sin(phase)
    # Against the sine's own phase, thresholds lie on a line that clipping does not bend.
    unit = balance(np.sin(phase), zeros)
    reached = np.flatnonzero(np.isfinite(unit))
    if reached.size < 2:
        raise InputError(
            "fewer than two comparators change their decision; a sine over the range is needed"
        )
    amplitude, middle = (float(x) for x in np.polyfit(unit[reached], reached + 1.0, 1))
    found = FoundSine(
        cycles,
        coherent,
        amplitude,
        middle,
        phase,
        fundamental,
        middle + amplitude * unit,
    )
    _refuse_clipped(found, unit, bits)
    _refuse_no_sine(codes, found, bits)
    if amplitude < 2 ** (bits - 2):
        raise InputError(
            f"holds a sine of {amplitude:.3g} LSB amplitude; at least half the range, {2 ** (bits - 2)} LSB, is needed"
        )
    return found


def _refuse_clipped(found: FoundSine, unit: Floats, bits: int) -> None:
    few = max(2, unit.size // 16)
    for name, edge, room in (
        ("above", 1 - unit[::-1][:few], np.arange(few) + 1.0),
        ("below", 1 + unit[:few], np.arange(few) + 1.0),
    ):
        beyond = found.amplitude * edge - room
        if np.isfinite(beyond).any() and np.nanmean(beyond) > _MOST_OVERDRIVE_LSB:
            raise InputError(
                f"holds a clipped sine: it reaches {np.nanmean(beyond):.2g} LSB {name} the range of {2**bits} codes; "
                f"at most {_MOST_OVERDRIVE_LSB} LSB is accepted"
            )


def _refuse_no_sine(codes: NDArray[np.int64], found: FoundSine, bits: int) -> None:
    sndr = sine_fit_sndr_db(codes, found)
    least = min(_LEAST_SNDR_DB, ideal_sndr_db(bits) - _MOST_LOSS_DB)
    if sndr < least:
        raise InputError(
            f"is no sine: the best one ({found.cycles:.6g} cycles) leaves {sndr:.3g} dB; at least {least:.3g} dB is "
            f"accepted at {bits} bits"
        )


def sine_fit_sndr_db(codes: NDArray[np.int64], found: FoundSine) -> float:
    """Power of the codes' fundamental against all that it leaves, in dB, coherent or not."""
    rest = codes - found.fundamental
    signal = float(np.var(found.fundamental))
    return float(10 * np.log10(signal / max(float(rest @ rest) / codes.size, 1e-30)))


def _three_parameters(codes: Floats, cycles: float) -> tuple[Floats, Floats]:
    """Sine, cosine and constant that fit best at known cycles, and the phase of the sum at each sample."""
    turn = 2 * np.pi * ((np.arange(codes.size) * cycles / codes.size) % 1.0)
    basis = np.stack([np.sin(turn), np.cos(turn), np.ones_like(turn)], axis=1)
    fit = np.linalg.lstsq(basis, codes, rcond=None)[0]
    return fit, turn + float(np.arctan2(fit[1], fit[0]))


def _four_parameters(codes: Floats) -> tuple[float, float]:
    """Cycles of the largest sine, and their standard error, which the rest allows."""
    count = codes.size
    spectrum = np.abs(
        np.fft.rfft((codes - codes.mean()) * blackmanharris(count, sym=False))
    )
    top = int(np.argmax(spectrum[1:-1])) + 1
    # The parabola through the logarithms of a window's main lobe finds its top within a few hundredths of a bin.
    left, middle, right = np.log(spectrum[top - 1 : top + 2] + 1e-30)
    cycles = top + 0.5 * (left - right) / (left - 2 * middle + right - 1e-30)
    time = np.arange(count) / count - 0.5
    for _ in range(8):
        fit, phase = _three_parameters(codes, cycles)
        amplitude = float(np.hypot(fit[0], fit[1]))
        rest = codes - fit[2] - amplitude * np.sin(phase)
        lever = 2 * np.pi * amplitude * time * np.cos(phase)
        step = float(lever @ rest / (lever @ lever))
        cycles += step
        if abs(step) < 1e-9:
            break
    error = float(np.sqrt(rest @ rest / count / (lever @ lever)))
    return float(cycles), error
