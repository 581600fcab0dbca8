"""Captured codes against a plan: linearity, spectrum, and what errors explain them."""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.signal.windows import hann

from flashplan.errors import InputError
from flashplan.measure.capture import Capture
from flashplan.measure.diagnose import Finding, diagnose
from flashplan.measure.sine import FoundSine, find_sine, sine_fit_sndr_db
from flashplan.metrics.ideal import enob_from_sndr
from flashplan.metrics.linearity import Fit, dnl_inl
from flashplan.metrics.spectrum import sine_metrics
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]

# Decisions rebuilt from codes at most: a quarter of a gigabyte.
_MOST_REBUILT = 2**28


@dataclass(frozen=True)
class MeasureResult:
    """What a capture says.

    frequency: of the input in Hz, taken to lie below half the sample rate; amplitude_lsb, middle_lsb: of the input.
    dnl_lsb: (M - 1,) of the inner codes; inl_lsb: (M,) of the thresholds; nan where the input did not reach.
    diagnosis: by budget line, and `ladder_bow`; rebuilt: whether decisions were rebuilt from codes.
    """

    samples: int
    cycles: float
    coherent: bool
    frequency: float
    amplitude_lsb: float
    middle_lsb: float
    linearity_fit: str
    dnl_lsb: Floats
    inl_lsb: Floats
    sndr_db: float
    sfdr_db: float
    enob: float
    rebuilt: bool
    diagnosis: dict[str, Finding]

    def to_dict(self) -> dict[str, Any]:
        """The result as plain JSON types; null where a threshold was not reached."""
        plain = {name: getattr(self, name) for name in self.__dataclass_fields__}
        for name in ("dnl_lsb", "inl_lsb"):
            plain[name] = [None if np.isnan(x) else float(x) for x in plain[name]]
        plain["diagnosis"] = {k: f.to_dict() for k, f in self.diagnosis.items()}
        return plain


def measure_capture(
    capture: Capture, plan: Plan, limits: Mapping[str, float | None]
) -> MeasureResult:
    """Measure a record of a sine and explain it.

    capture: from `read_capture`; limits: of budget lines by name, SI.
    The input's amplitude and middle are taken from the codes, so that gain and offset of the converter are not told from
    those of the source: the line "none" comes out as "best" does. Where the capture holds codes only, comparator k is
    taken to have decided 1 at every code of k or more: bubbles are then invisible, and the diagnosis is left empty where
    errors are large enough to make many.
    Raises InputError for a record that holds no sine of at least five cycles and half the range within the range.
    Source: IEEE Std 1241-2010 (memory).
    """
    bits, codes = plan.converter.bits, capture.codes
    found = find_sine(codes, _zeros(capture, plan.comparators), bits)
    dnl, inl = _linearity(found.level, plan.goals.linearity_fit)
    sndr, sfdr = _spectrum(codes, found)
    frequency = found.cycles / codes.size * plan.converter.sample_rate
    decisions = capture.decisions
    if decisions is None:
        some = codes[: _MOST_REBUILT // plan.comparators]
        decisions = some[:, None] > np.arange(plan.comparators)
    length = decisions.shape[0]
    slope = 2 * np.pi * frequency * found.amplitude * np.cos(found.phase)
    rebuilt = capture.decisions is None
    diagnosis = diagnose(
        found.value[:length], slope[:length], decisions, plan.lsb, rebuilt
    )
    return MeasureResult(
        samples=codes.size,
        cycles=found.cycles,
        coherent=found.coherent,
        frequency=frequency,
        amplitude_lsb=found.amplitude,
        middle_lsb=found.middle,
        linearity_fit=plan.goals.linearity_fit,
        dnl_lsb=dnl,
        inl_lsb=inl,
        sndr_db=sndr,
        sfdr_db=sfdr,
        enob=float(enob_from_sndr(sndr)),
        rebuilt=rebuilt,
        diagnosis={name: _judged(f, limits.get(name)) for name, f in diagnosis.items()},
    )


def _zeros(capture: Capture, comparators: int) -> NDArray[np.int64]:
    if capture.decisions is None:
        return np.cumsum(np.bincount(capture.codes, minlength=comparators + 1))[:-1]
    return capture.codes.size - np.count_nonzero(capture.decisions, axis=0)


def _linearity(level: Floats, fit: Fit) -> tuple[Floats, Floats]:
    """DNL and INL of the thresholds that the input reached, nan elsewhere."""
    reached = np.flatnonzero(np.isfinite(level))
    first, last = int(reached[0]), int(reached[-1])
    if reached.size != last - first + 1:
        stuck = int(np.flatnonzero(np.isnan(level[first:last]))[0]) + first + 1
        raise InputError(
            f"comparator {stuck} never changes its decision, though the input passes its threshold"
        )
    dnl, inl = np.full(level.size - 1, np.nan), np.full(level.size, np.nan)
    within = slice(first, last + 1)
    errors = level[within] - np.arange(first + 1, last + 2)
    dnl[first:last], inl[within] = dnl_inl(errors, fit)
    return dnl, inl


def _spectrum(codes: NDArray[np.int64], found: FoundSine) -> tuple[float, float]:
    """SNDR and SFDR in dB; from a windowed spectrum of what the fitted sine leaves where the record is not coherent."""
    if found.coherent:
        metrics = sine_metrics(codes, round(found.cycles))
        return float(metrics.sndr_db[0]), float(metrics.sfdr_db[0])
    window = hann(codes.size, sym=False)
    rest = (codes - found.fundamental) * window
    power = 2 * np.abs(np.fft.rfft(rest)) ** 2 / codes.size / float(window @ window)
    # Nearly all of a line's power lies in the five bins about it, wherever between two bins it falls.
    line = float(np.convolve(power, np.ones(5), mode="valid").max())
    signal = float(np.var(found.fundamental))
    return sine_fit_sndr_db(codes, found), float(10 * np.log10(signal / line))


def _judged(finding: Finding, limit: float | None) -> Finding:
    if limit is None:
        return finding
    met = True if finding.high <= limit else False if finding.low > limit else None
    return replace(finding, limit=limit, met=met)
