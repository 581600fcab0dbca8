"""The whole array against the plan's goals."""

from concurrent.futures import Executor

import numpy as np

from flashplan.array import dynamic, static
from flashplan.array.result import ArrayResult, DynamicResult, StaticResult
from flashplan.array.words import decoder_words
from flashplan.cell.check import TOLERANCE
from flashplan.decoder import scheme_energy
from flashplan.ladder import LadderResult, solve_ladder, systematic_errors
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan
from flashplan.study.progress import Progress
from flashplan.study.run import run_study

_STATIC_KEYS = ("offset_sigma", "kickback_charge")
_DYNAMIC_KEYS = (
    "offset_sigma",
    "noise_sigma",
    "hysteresis",
    "skew_sigma",
    "kickback_charge",
    "coupling_capacitance",
)
_TIME_KEYS = ("regeneration_tau", "delay")


def simulate_array(
    plan: Plan,
    cell: Datasheet,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> ArrayResult:
    """Draw the arrays, convert the sine, and judge both against the goals.

    plan: with its ladder resistance resolved; cell: what is known of one comparator. Keys that the cell does not give
    are listed in `left_out` and leave the goals that hang on them open.
    """
    ladder = solve_ladder(plan, cell)
    needed = dict.fromkeys((*_STATIC_KEYS, *_DYNAMIC_KEYS, *_TIME_KEYS))
    left_out = tuple(key for key in needed if getattr(cell, key) is None)
    if plan.converter.source_resistance is not None and cell.input_capacitance is None:
        left_out += ("input_capacitance",)
    static_part = (
        None
        if "offset_sigma" in left_out
        else _static(plan, cell, ladder, executor, progress)
    )
    dynamic_part = (
        None
        if set(left_out) & set(_DYNAMIC_KEYS[:4])
        else _dynamic(plan, cell, ladder, executor, progress)
    )
    word_error_rate = (
        None
        if set(left_out) & set(_TIME_KEYS)
        else dynamic.undecided_word_rate(plan, cell)
    )
    energy = None
    if dynamic_part is not None:
        energy = scheme_energy(plan, decoder_words(plan, dynamic_part, word_error_rate))
    return ArrayResult(
        static=static_part,
        dynamic=dynamic_part,
        word_error_rate=word_error_rate,
        power=array_power(plan, cell, ladder, energy),
        goals_met=_goals_met(
            plan, static_part, dynamic_part, word_error_rate, left_out
        ),
        left_out=left_out,
    )


def array_power(
    plan: Plan, cell: Datasheet, ladder: LadderResult, decoder_energy: float | None
) -> dict[str, float | None]:
    """Power in W of comparators, ladder and decoder; None where the datasheet or the plan does not give it.

    decoder_energy: in J per conversion.
    """
    rate = plan.converter.sample_rate
    comparators = None
    if cell.energy is not None and cell.static_power is not None:
        comparators = plan.comparators * (cell.energy * rate + cell.static_power)
    decoder = None if decoder_energy is None else decoder_energy * rate
    parts = (comparators, ladder.power, decoder)
    known = [part for part in parts if part is not None]
    return {
        "comparators": comparators,
        "ladder": ladder.power,
        "decoder": decoder,
        "total": sum(known) if len(known) == len(parts) else None,
    }


def _static(
    plan: Plan,
    cell: Datasheet,
    ladder: LadderResult,
    executor: Executor | None,
    progress: Progress | None,
) -> StaticResult:
    systematic = systematic_errors(ladder)
    offset = (cell.offset_sigma or 0.0) / plan.lsb
    trials = run_study(
        static.StaticChunk(plan, offset, systematic),
        static.chunk_count(plan),
        seed=2 * plan.array.seed,
        executor=executor,
        progress=progress,
    )
    return static.gather(plan, cell, systematic, trials)


def _dynamic(
    plan: Plan,
    cell: Datasheet,
    ladder: LadderResult,
    executor: Executor | None,
    progress: Progress | None,
) -> DynamicResult:
    trials = run_study(
        dynamic.OneArray(plan, cell, ladder),
        plan.array.dynamic_arrays,
        seed=2 * plan.array.seed + 1,
        executor=executor,
        progress=progress,
    )
    return dynamic.gather(plan, cell, trials)


def _goals_met(
    plan: Plan,
    static_part: StaticResult | None,
    dynamic_part: DynamicResult | None,
    word_error_rate: float | None,
    left_out: tuple[str, ...],
) -> dict[str, bool | None]:
    goals = plan.goals
    linearity = enob = word_errors = None
    if static_part is not None and not set(left_out) & set(_STATIC_KEYS):
        linearity = static_part.exact_yield >= goals.yield_ * (1 - TOLERANCE)
    if dynamic_part is not None and not set(left_out) & {
        *_DYNAMIC_KEYS,
        "input_capacitance",
    }:
        enob = bool(
            np.isfinite(dynamic_part.enob_low)
            and dynamic_part.enob_low >= goals.enob * (1 - TOLERANCE)
        )
    if word_error_rate is not None:
        word_errors = word_error_rate <= goals.word_error_rate * (1 + TOLERANCE)
    return {"linearity": linearity, "enob": enob, "word_error_rate": word_errors}
