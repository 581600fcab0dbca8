"""The rooms run one after the other: each verb's work, from a plan and perhaps another cell than the plan's."""

from concurrent.futures import Executor
from pathlib import Path

from flashplan import array, decoder, ladder
from flashplan.array.result import ArrayResult
from flashplan.budget.derive import derive_budget
from flashplan.budget.reference import resolved
from flashplan.budget.result import Budget
from flashplan.cell import size
from flashplan.cell.sized import SizedCell
from flashplan.decoder import DecoderTable
from flashplan.errors import InputError
from flashplan.ladder import LadderResult
from flashplan.measure import MeasureResult, measure_capture, read_capture
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.load import with_cell
from flashplan.plan.model import Plan
from flashplan.study.progress import Progress


def solve_ladder(plan: Plan, cell: Datasheet | None = None) -> LadderResult:
    """Solve the reference ladder; "auto" becomes the largest resistance that the budget allows. Raises InputError."""
    plan, cell = _ready(plan, cell)
    return ladder.solve_ladder(plan, cell)


def simulate_array(
    plan: Plan,
    cell: Datasheet | None = None,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> ArrayResult:
    """Simulate the whole array with a cell, the plan's own where none is given. Raises InputError."""
    plan, cell = _ready(plan, cell)
    return array.simulate_array(plan, cell, executor, progress)


def compare_decoders(
    plan: Plan,
    cell: Datasheet | None = None,
    result: ArrayResult | None = None,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> DecoderTable:
    """Compare all decoder schemes on the array's own words; `result` spares a second simulation. Raises InputError."""
    plan, cell = _ready(plan, cell)
    if result is None:
        result = array.simulate_array(plan, cell, executor, progress)
    if result.dynamic is None:
        missing = ", ".join(result.left_out)
        raise InputError(
            f"decoders are compared on converted words, and the cell does not give {missing}",
            plan.source,
        )
    words = array.decoder_words(plan, result.dynamic, result.word_error_rate)
    return decoder.compare_schemes(plan, words)


def size_cell(
    plan: Plan,
    budget: Budget | None = None,
    topology: str | None = None,
    progress: Progress | None = None,
) -> SizedCell:
    """Size a comparator for a plan against its budget, derived where none is given. Raises InputError."""
    return size.size_cell(
        plan,
        derive_budget(plan) if budget is None else budget,
        topology,
        progress=progress,
    )


def measure_codes(codes: str | Path, plan: Plan) -> MeasureResult:
    """Measure and explain a file of captured codes against the plan and its budget. Raises InputError."""
    limits = {name: line.limit for name, line in derive_budget(plan).lines.items()}
    capture = read_capture(codes, plan.converter.bits)
    try:
        return measure_capture(capture, plan, limits)
    except InputError as error:
        raise InputError(error.message, error.where or str(codes)) from None


def _ready(plan: Plan, cell: Datasheet | None) -> tuple[Plan, Datasheet]:
    cell = plan.datasheet if cell is None else cell
    return resolved(with_cell(plan, cell)), cell
