"""Captures of a sine by an array whose errors are known: what the tests plant, and should find again."""

from dataclasses import dataclass

import numpy as np

from flashplan.array.window import Comparators, Signal, convert, reach
from flashplan.measure.capture import Capture
from flashplan.plan.load import plan_from_table
from flashplan.plan.model import Plan


def plan(bits: int, linearity_fit: str = "best") -> Plan:
    """A plan of 10 mV per LSB at 1 GHz."""
    return plan_from_table(
        {
            "converter": {
                "bits": bits,
                "sample_rate": 1e9,
                "input_frequency": 0.45e9,
                "full_scale": 0.01 * 2**bits,
                "supply": 1.0,
            },
            "goals": {"enob": bits - 1.0, "linearity_fit": linearity_fit},
        }
    )


@dataclass(frozen=True)
class Planted:
    """Errors in SI, as the diagnosis names them."""

    offset_sigma: float = 1.2e-3
    noise_sigma: float = 1.2e-3
    hysteresis: float = 2.0e-3
    skew_sigma: float = 1.0e-12
    jitter_sigma: float = 0.8e-12
    ladder_bow: float = 1.5e-3


def capture(
    planted: Planted,
    plan: Plan,
    cycles: float,
    seed: int,
    samples: int = 65536,
    amplitude: float = 1.0,
    middle_lsb: float = 0.0,
) -> Capture:
    """One drawn array converts a sine; amplitude against full scale, middle against mid-scale."""
    draw = np.random.default_rng(seed)
    count, lsb, half = plan.comparators, plan.lsb, 2.0 ** (plan.converter.bits - 1)
    angle = 2 * np.pi * cycles / samples * plan.converter.sample_rate
    phase = 2 * np.pi * (np.arange(samples) * cycles / samples % 1.0) + 0.4
    phase += angle * planted.jitter_sigma * draw.standard_normal(samples)
    signal = Signal(
        half + middle_lsb + amplitude * half * np.sin(phase),
        angle * amplitude * half * np.cos(phase),
        phase,
    )
    place = np.arange(1, count + 1) / (count + 1)
    errors = planted.offset_sigma * draw.standard_normal(count)
    errors += planted.ladder_bow * 4 * place * (1 - place)
    comparators = Comparators(
        thresholds=np.arange(1, count + 1) + errors / lsb,
        skew=planted.skew_sigma * draw.standard_normal(count),
        noise=planted.noise_sigma / lsb,
        hysteresis=planted.hysteresis / lsb,
        undecided=0.0,
    )
    decided = convert(signal, comparators, draw, reach(comparators, signal))
    words = decided.words(np.arange(samples))
    return Capture(words.sum(axis=1, dtype=np.int64), words)
