"""The dynamic run: drawn arrays convert a coherent sine; spectrum, bubbles and the reach of nearly all arrays."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.array.draws import FixedError, fixed_error_power
from flashplan.array.result import DynamicResult, Interval
from flashplan.array.window import Comparators, Decisions, Signal, convert, reach
from flashplan.budget.regeneration import regeneration_time, undecided_rate, valid_level
from flashplan.budget.source import input_droop
from flashplan.decoder import decode
from flashplan.ladder import LadderResult, systematic_errors
from flashplan.metrics.bubbles import count_bubbles_by_order
from flashplan.metrics.ideal import enob_from_sndr
from flashplan.metrics.intervals import wilson_interval
from flashplan.metrics.pinned_walk import walk_power, walk_spectrum
from flashplan.metrics.spectrum import coherent_frequency, power_spectrum, sine_metrics
from flashplan.metrics.static_run import draw_threshold_errors
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]

# Samples converted at once; bounds the memory whatever the length of the record.
_BLOCK = 65536


@dataclass(frozen=True)
class OneArray:
    """Trial of the dynamic run: draws array `index` and converts the record. Picklable, for worker processes."""

    plan: Plan
    cell: Datasheet
    ladder: LadderResult

    def __call__(
        self, index: int, generator: np.random.Generator
    ) -> dict[str, NDArray]:
        plan, cell = self.plan, self.cell
        converter, bits = plan.converter, plan.converter.bits
        offset = (cell.offset_sigma or 0.0) / plan.lsb
        errors = draw_threshold_errors(
            generator, 1, bits, offset, plan.ladder.resistor_sigma
        )[0]
        skew = generator.standard_normal(plan.comparators) * (cell.skew_sigma or 0.0)
        comparators = Comparators(
            thresholds=np.arange(1, plan.comparators + 1)
            + errors
            + systematic_errors(self.ladder),
            skew=skew,
            noise=(cell.noise_sigma or 0.0) / plan.lsb,
            hysteresis=(cell.hysteresis or 0.0) / plan.lsb,
            undecided=undecided_reach(plan, cell),
            sway=self.ladder.feedthrough_lsb,
        )
        cycles, frequency = coherent_frequency(
            converter.sample_rate, converter.input_frequency, plan.array.samples
        )
        codes = np.empty(plan.array.samples, dtype=np.int64)
        words, clean = [], np.zeros(plan.comparators + 1, dtype=np.int64)
        before: Decisions | None = None
        start = generator.uniform(0, 2 * np.pi)
        for low in range(0, codes.size, _BLOCK):
            block = np.arange(low, min(low + _BLOCK, codes.size))
            signal = sine_signal(plan, cell, frequency, cycles, block, start, generator)
            before = convert(
                signal, comparators, generator, reach(comparators, signal), before
            )
            ones, bubbly = before.ones(), before.bubbly()
            clean += np.bincount(np.delete(ones, bubbly), minlength=clean.size)
            if bubbly.size:
                bad = before.words(bubbly)
                ones[bubbly] = decode(plan.decoder.scheme, bad)
                words.append(bad)
            codes[block] = ones
        bubbly_words = (
            np.concatenate(words)
            if words
            else np.zeros((0, plan.comparators), dtype=bool)
        )
        metrics = sine_metrics(codes[None].astype(float), cycles)
        power = power_spectrum(codes - codes.mean())
        return {
            "errors": errors,
            "skew": skew,
            "error_power": metrics.error_power,
            "signal_power": np.atleast_1d(metrics.signal_power),
            "sfdr_db": metrics.sfdr_db,
            "spectrum": power / power.max(),
            "clean": clean,
            "words": np.packbits(bubbly_words, axis=1),
        }


def undecided_reach(plan: Plan, cell: Datasheet) -> float:
    """Distance from its threshold, in LSB, within which a comparator stays undecided; 0 where the cell does not tell."""
    if cell.regeneration_tau is None or cell.delay is None:
        return 0.0
    return 0.5 * undecided_word_rate(plan, cell)


def undecided_word_rate(plan: Plan, cell: Datasheet) -> float:
    """Undecided-comparator word errors per conversion, from the cell's own time constant, gain (else 1) and delay."""
    assert cell.regeneration_tau is not None
    assert cell.delay is not None
    gain = 1.0 if cell.regeneration_gain is None else cell.regeneration_gain
    time = max(regeneration_time(plan, cell.delay), 0.0)
    return undecided_rate(
        time, cell.regeneration_tau, gain, valid_level(plan), plan.lsb
    )


def sine_signal(
    plan: Plan,
    cell: Datasheet,
    frequency: float,
    cycles: int,
    samples: NDArray[np.int64],
    start: float,
    generator: np.random.Generator,
) -> Signal:
    """A full-scale sine after the source's own low-pass, at jittered instants; `samples` are indices into the record."""
    converter = plan.converter
    half = 2.0 ** (converter.bits - 1)
    amplitude = half
    if converter.source_resistance is not None and cell.input_capacitance is not None:
        capacitance = plan.comparators * cell.input_capacitance
        amplitude *= np.sqrt(
            input_droop(frequency, converter.source_resistance, capacitance)
        )
    # Whole cycles in integers, so that a long record stays coherent to the last sample.
    turn = (samples * cycles % plan.array.samples) / plan.array.samples
    angle = 2 * np.pi * frequency
    phase = (
        2 * np.pi * turn
        + start
        + angle * plan.clock.jitter_sigma * generator.standard_normal(samples.size)
    )
    return Signal(
        half + amplitude * np.sin(phase), angle * amplitude * np.cos(phase), phase
    )


def gather(
    plan: Plan, cell: Datasheet, trials: list[dict[str, NDArray]]
) -> DynamicResult:
    """Put the trials of `OneArray` together."""
    converter = plan.converter
    cycles, frequency = coherent_frequency(
        converter.sample_rate, converter.input_frequency, plan.array.samples
    )
    fixed = _fixed(plan, cell, trials)
    power = np.concatenate([trial["error_power"] for trial in trials])
    signal = float(np.mean([trial["signal_power"] for trial in trials]))
    # What was drawn once is known exactly for these arrays; taking it out and its exact mean or quantile back in
    # leaves only what a few arrays measure well.
    rest = power - fixed.drawn
    spread = (
        float(rest.std(ddof=1) / np.sqrt(rest.size)) if rest.size > 1 else float("nan")
    )
    enob, enob_interval = _enob(signal, float(rest.mean()) + fixed.mean, spread)
    low, low_interval = _enob(signal, float(rest.mean()) + fixed.quantile, spread)
    words = np.concatenate(
        [
            np.unpackbits(trial["words"], axis=1, count=plan.comparators).astype(bool)
            for trial in trials
        ]
    )
    total = plan.array.samples * len(trials)
    return DynamicResult(
        arrays=len(trials),
        samples=plan.array.samples,
        frequency=frequency,
        cycles=cycles,
        sndr_db=10 * float(np.log10(signal / (rest.mean() + fixed.mean))),
        sfdr_db=float(np.mean([trial["sfdr_db"] for trial in trials])),
        enob=enob,
        enob_interval=enob_interval,
        enob_low=low,
        enob_low_interval=low_interval,
        error_power_lsb2=power,
        bubble_rate=words.shape[0] / total,
        bubble_rate_interval=Interval(*wilson_interval(words.shape[0], total)),
        bubbles_by_order=count_bubbles_by_order(words),
        spectrum_db=10
        * np.log10(np.maximum(np.mean([t["spectrum"] for t in trials], axis=0), 1e-20)),
        bubbly_words=words,
        clean_counts=np.sum([trial["clean"] for trial in trials], axis=0),
    )


def _enob(signal: float, power: float, spread: float) -> tuple[float, Interval]:
    def bits(error: float) -> float:
        return enob_from_sndr(10 * float(np.log10(signal / error)))

    return bits(power), Interval(
        bits(power + 1.96 * spread), bits(max(power - 1.96 * spread, power * 1e-3))
    )


def _fixed(plan: Plan, cell: Datasheet, trials: list[dict[str, NDArray]]) -> FixedError:
    bits = plan.converter.bits
    return fixed_error_power(
        bits,
        plan.converter.full_scale,
        plan.converter.input_frequency,
        np.stack([trial["errors"] for trial in trials]),
        np.stack([trial["skew"] for trial in trials]),
        (cell.offset_sigma or 0.0) / plan.lsb,
        cell.skew_sigma or 0.0,
        plan.ladder.resistor_sigma**2 * walk_power(bits) * walk_spectrum(bits),
        plan.goals.yield_,
    )
