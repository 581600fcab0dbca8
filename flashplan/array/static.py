"""The static run: linearity of many drawn arrays, with the exact yield beside the drawn one."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from flashplan.array.result import BANDS, Interval, StaticResult
from flashplan.metrics.exact_yield import linearity_yield
from flashplan.metrics.intervals import wilson_interval
from flashplan.metrics.linearity import dnl_inl
from flashplan.metrics.static_run import draw_threshold_errors, judge_arrays
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan
from flashplan.study.threads import one_thread

# Thresholds drawn at once, a megabyte: small enough for the cache; but never so few arrays that numpy's calls cost more.
_CHUNK_THRESHOLDS = 2**17
_FEWEST_ARRAYS = 128


def chunk_arrays(plan: Plan) -> int:
    """Arrays in one chunk; part of what makes a seed's result what it is."""
    return min(
        plan.array.arrays, max(_FEWEST_ARRAYS, _CHUNK_THRESHOLDS // plan.comparators)
    )


def chunk_count(plan: Plan) -> int:
    """Number of chunks of the static run."""
    return -(-plan.array.arrays // chunk_arrays(plan))


@dataclass(frozen=True)
class StaticChunk:
    """Trial of the static run: draws chunk `index`. Picklable, for worker processes."""

    plan: Plan
    offset_sigma_lsb: float
    systematic_lsb: NDArray[np.float64]

    def __call__(
        self, index: int, generator: np.random.Generator
    ) -> dict[str, NDArray]:
        plan, size = self.plan, chunk_arrays(self.plan)
        arrays = min(size, plan.array.arrays - index * size)
        errors = draw_threshold_errors(
            generator,
            arrays,
            plan.converter.bits,
            self.offset_sigma_lsb,
            plan.ladder.resistor_sigma,
            self.systematic_lsb,
        )
        goals = plan.goals
        passed, max_dnl, max_inl = judge_arrays(
            errors, goals.linearity_fit, goals.dnl_lsb, goals.inl_lsb
        )
        found = {"passed": passed, "max_dnl": max_dnl, "max_inl": max_inl}
        if index == 0:  # one chunk is enough for the bands at each code
            dnl, inl = dnl_inl(errors, goals.linearity_fit)
            found["dnl_band"] = np.percentile(dnl, BANDS, axis=0)
            found["inl_band"] = np.percentile(inl, BANDS, axis=0)
        return found


def gather(
    plan: Plan,
    cell: Datasheet,
    systematic_lsb: NDArray[np.float64],
    trials: list[dict[str, NDArray]],
) -> StaticResult:
    """Put the chunks together and work out the exact yield."""
    goals = plan.goals
    passed = int(sum(trial["passed"].sum() for trial in trials))
    with one_thread():
        exact = linearity_yield(
            plan.converter.bits,
            (cell.offset_sigma or 0.0) / plan.lsb,
            goals.dnl_lsb,
            goals.inl_lsb,
            goals.linearity_fit,
            plan.ladder.resistor_sigma,
            systematic_lsb,
        )
    return StaticResult(
        arrays=plan.array.arrays,
        passed=passed,
        yield_interval=Interval(*wilson_interval(passed, plan.array.arrays)),
        exact_yield=exact.yield_,
        max_dnl_lsb=np.concatenate([trial["max_dnl"] for trial in trials]),
        max_inl_lsb=np.concatenate([trial["max_inl"] for trial in trials]),
        dnl_band_lsb=trials[0]["dnl_band"],
        inl_band_lsb=trials[0]["inl_band"],
        systematic_lsb=systematic_lsb,
    )
