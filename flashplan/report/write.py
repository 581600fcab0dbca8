"""The report: every room's result in one folder, as page, figures, JSON and CSV."""

from collections.abc import Iterable, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from flashplan.array.result import ArrayResult
from flashplan.budget.derive import derive_budget
from flashplan.budget.result import Budget
from flashplan.cell.check import Verdict, check_cell
from flashplan.chain import compare_decoders, simulate_array, solve_ladder
from flashplan.decoder import DecoderTable
from flashplan.files import as_csv, as_json, make_folder, write_whole
from flashplan.ladder import LadderResult
from flashplan.plan.model import Plan
from flashplan.report.page import page_sections, render_page
from flashplan.report.words import headline
from flashplan.study.progress import Progress


@dataclass(frozen=True)
class Written:
    """Where a report went and what its first line says."""

    page: Path
    headline: str
    met: bool


@dataclass(frozen=True)
class Results:
    """Everything that a report is made of."""

    plan: Plan
    budget: Budget
    verdict: Verdict
    ladder: LadderResult
    array: ArrayResult
    decoders: DecoderTable


def gather_results(
    plan: Plan, executor: Executor | None = None, progress: Progress | None = None
) -> Results:
    """Run every room for a plan and its own cell. Raises InputError."""
    budget = derive_budget(plan)
    array = simulate_array(plan, executor=executor, progress=progress)
    return Results(
        plan=plan,
        budget=budget,
        verdict=check_cell(plan.datasheet, budget),
        ladder=solve_ladder(plan),
        array=array,
        decoders=compare_decoders(plan, result=array),
    )


def write_report(
    plan: Plan,
    folder: str | Path,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> Written:
    """Write the whole report of a plan into a folder, which is made where it is not there.

    Files: index.html (self-contained), figures/*.svg, one JSON file a verb, CSV files. Raises InputError.
    """
    folder = Path(folder)
    make_folder(folder / "figures")
    results = gather_results(plan, executor, progress)
    sections = page_sections(results)
    for section in sections:
        for drawn in section.figures:
            write_whole(folder / "figures" / f"{drawn.name}.svg", drawn.svg)
    for name, document in _documents(results).items():
        write_whole(folder / f"{name}.json", as_json(document))
    for name, (columns, rows) in _tables(results).items():
        write_whole(folder / f"{name}.csv", as_csv(columns, rows))
    page = folder / "index.html"
    write_whole(page, render_page(results, sections))
    return Written(
        page, headline(plan, results.array), all(results.array.goals_met.values())
    )


def _documents(results: Results) -> dict[str, dict[str, Any]]:
    return {
        "budget": results.budget.to_dict(),
        "check": results.verdict.to_dict(),
        "ladder": results.ladder.to_dict(),
        "array": results.array.to_dict(),
        "decoders": results.decoders.to_dict(),
    }


def _tables(
    results: Results,
) -> dict[str, tuple[Sequence[str], Iterable[Sequence[Any]]]]:
    ladder = results.ladder.to_dict()
    effects = [
        name for name, values in ladder["errors_lsb"].items() if values is not None
    ]
    columns = [ladder["errors_lsb"][name] for name in effects]
    tables: dict[str, tuple[Sequence[str], Iterable[Sequence[Any]]]] = {
        "budget": (
            ("name", "limit", "unit", "share", "value", "margin", "met"),
            [
                (
                    line.name,
                    line.limit,
                    line.unit,
                    line.share,
                    judged.value,
                    judged.margin,
                    judged.met,
                )
                for line, judged in zip(
                    results.budget.lines.values(),
                    results.verdict.lines.values(),
                    strict=True,
                )
            ],
        ),
        "taps": (
            ("tap", "voltage_v", *(f"{name}_lsb" for name in effects)),
            [
                (k + 1, v, *(c[k] for c in columns))
                for k, v in enumerate(ladder["taps"])
            ],
        ),
    }
    schemes = results.decoders.to_dict()["schemes"]
    plain = [
        key for key, value in schemes[0].items() if not isinstance(value, (dict, list))
    ]
    tables["decoders"] = (plain, [[scheme[key] for key in plain] for scheme in schemes])
    if results.array.static is not None:
        static = results.array.static
        tables["arrays"] = (
            ("array", "max_dnl_lsb", "max_inl_lsb"),
            zip(
                range(static.arrays),
                static.max_dnl_lsb.tolist(),
                static.max_inl_lsb.tolist(),
                strict=True,
            ),
        )
    return tables
