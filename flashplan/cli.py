"""The verbs: parse, call the API, print. Nothing heavy is loaded before a verb needs it."""

import sys
from collections.abc import Callable
from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from flashplan.errors import InputError

if TYPE_CHECKING:
    from rich.console import RenderableType

app = typer.Typer(
    name="flashplan",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    help="Plan the comparator array of a flash A/D converter. A planning estimate, not a sign-off.",
)


class Rank(StrEnum):
    """What decoder schemes may be sorted by."""

    error = "error"
    energy = "energy"
    depth = "depth"


class Topology(StrEnum):
    """Topologies that a cell may be sized in."""

    single_tail = "single-tail"
    double_tail = "double-tail"
    preamp_latch = "preamp-latch"
    three_stage = "three-stage"
    all = "all"


_INTERRUPTED = 130

PlanFile = Annotated[
    Path, typer.Argument(metavar="PLAN", help="plan file (TOML)", show_default=False)
]
AsJson = Annotated[
    bool, typer.Option("--json", help="print one JSON document and nothing else")
]
OutFile = Annotated[
    Path | None,
    typer.Option("--out", metavar="FILE", help="write the JSON document to FILE"),
]
Workers = Annotated[
    int,
    typer.Option("--workers", metavar="N", min=1, help="processes to share the work"),
]


@app.command()
def new(
    path: Annotated[Path, typer.Argument(metavar="PATH", help="file to write")],
) -> None:
    """Write a commented starter plan."""
    from flashplan.plan.starter import write_starter

    write_starter(path)
    print(f"wrote {path}; next: flashplan budget {path}")


@app.command()
def budget(plan: PlanFile, json: AsJson = False, out: OutFile = None) -> None:
    """Limit of every per-comparator and ladder quantity, its share, formula and source."""
    import flashplan as fp
    from flashplan.report.tables import budget_table

    result = fp.derive_budget(fp.load_plan(plan))
    _emit(result.to_dict(), lambda: budget_table(result), json, out)


@app.command()
def explain(
    plan: PlanFile,
    name: Annotated[str, typer.Argument(metavar="NAME", help="a line of the budget")],
    json: AsJson = False,
    out: OutFile = None,
) -> None:
    """One budget line in full: formula, inputs with their values, source, sensitivities."""
    import flashplan as fp
    from flashplan.report.tables import explanation_table

    result = fp.explain_line(fp.load_plan(plan), name)
    _emit(result.to_dict(), lambda: explanation_table(result), json, out)


@app.command()
def ladder(plan: PlanFile, json: AsJson = False, out: OutFile = None) -> None:
    """Tap errors from mismatch, lead resistance, bias, kickback and input feedthrough."""
    import flashplan as fp
    from flashplan.report.tables import ladder_table

    result = fp.solve_ladder(fp.load_plan(plan))
    _emit(result.to_dict(), lambda: ladder_table(result), json, out)


@app.command()
def size(
    plan: PlanFile,
    topology: Annotated[
        Topology | None,
        typer.Option(
            "--topology",
            help="default: the plan's own, or double-tail; all: side by side",
        ),
    ] = None,
    json: AsJson = False,
    out: Annotated[
        Path | None,
        typer.Option(
            "--out", metavar="FILE", help="write the datasheet (TOML) to FILE"
        ),
    ] = None,
) -> None:
    """Size a comparator cell against the budget."""
    import flashplan as fp
    from flashplan.cell.sized import datasheet_toml
    from flashplan.files import as_json, write_whole
    from flashplan.report.size_tables import sized_table, topologies_table

    loaded = fp.load_plan(plan)
    if topology is Topology.all and out is not None:
        raise InputError("a datasheet is of one topology; name it", "--topology")
    names = (
        ["single-tail", "double-tail", "preamp-latch"]
        if topology is Topology.all
        else [topology]
    )
    budget = fp.derive_budget(loaded)
    with _progress() as progress:
        cells = [
            fp.size_cell(loaded, budget, name and str(name), progress) for name in names
        ]
    if out is not None:
        write_whole(out, datasheet_toml(cells[0]))
    if json:
        document = (
            cells[0].to_dict()
            if len(cells) == 1
            else {"cells": [cell.to_dict() for cell in cells]}
        )
        sys.stdout.write(as_json(document))
    else:
        _print(sized_table(cells[0]) if len(cells) == 1 else topologies_table(cells))
    _judge(any(cell.met for cell in cells))


@app.command()
def check(
    plan: PlanFile,
    cell: Annotated[Path, typer.Argument(metavar="CELL", help="datasheet file (TOML)")],
    json: AsJson = False,
    out: OutFile = None,
) -> None:
    """A datasheet against the budget, line by line, with margins."""
    import flashplan as fp
    from flashplan.report.tables import verdict_table

    verdict = fp.check_cell(fp.load_cell(cell), fp.derive_budget(fp.load_plan(plan)))
    _emit(verdict.to_dict(), lambda: verdict_table(verdict), json, out)
    _judge(verdict.met)


@app.command()
def array(
    plan: PlanFile,
    json: AsJson = False,
    out: OutFile = None,
    workers: Workers = 1,
    at_limits: Annotated[
        bool,
        typer.Option(
            "--at-limits",
            help="put every comparator and the clock on the budget's limits",
        ),
    ] = False,
) -> None:
    """Simulate the array: yield, DNL/INL, SNDR/ENOB, bubbles, word errors."""
    import flashplan as fp
    from flashplan.report.tables import array_table

    loaded = fp.load_plan(plan)
    if at_limits:
        loaded = fp.plan_at_limits(fp.derive_budget(loaded))
    with _progress() as progress, _executor(workers) as executor:
        result = fp.simulate_array(loaded, executor=executor, progress=progress)
    _emit(result.to_dict(), lambda: array_table(loaded, result), json, out)
    _judge(all(result.goals_met.values()))


@app.command()
def decoders(
    plan: PlanFile,
    json: AsJson = False,
    out: OutFile = None,
    workers: Workers = 1,
    rank: Annotated[
        Rank, typer.Option("--rank", help="what the table is sorted by")
    ] = Rank.error,
    verilog: Annotated[
        Path | None,
        typer.Option(
            "--verilog",
            metavar="FOLDER",
            help="write the plan's scheme and a self-checking bench",
        ),
    ] = None,
) -> None:
    """Compare all decoder schemes on the same array."""
    import flashplan as fp
    from flashplan.report.tables import decoder_table

    loaded = fp.load_plan(plan)
    with _progress() as progress, _executor(workers) as executor:
        table = fp.compare_decoders(loaded, executor=executor, progress=progress)
    if verilog is not None:
        from flashplan.report.verilog_files import write_verilog

        write_verilog(loaded, verilog)
    _emit(table.to_dict(), lambda: decoder_table(table, rank.value), json, out)


@app.command()
def sweep(
    plan: PlanFile,
    vary: Annotated[
        list[str],
        typer.Option(
            "--vary",
            metavar="KEY=...",
            help="START:STOP:COUNT, with :log behind, or a list; repeatable",
            show_default=False,
        ),
    ],
    store: Annotated[
        Path | None, typer.Option("--store", metavar="FILE", help="keeps finished work")
    ] = None,
    csv: Annotated[
        Path | None,
        typer.Option("--csv", metavar="FILE", help="write the points as CSV"),
    ] = None,
    figure: Annotated[
        Path | None,
        typer.Option("--figure", metavar="FILE", help="draw one or two axes as SVG"),
    ] = None,
    json: AsJson = False,
    out: OutFile = None,
    workers: Workers = 1,
    cluster: Annotated[
        str | None,
        typer.Option("--cluster", metavar="ADDRESS", help="a Dask scheduler"),
    ] = None,
) -> None:
    """A line or grid of plans: each point's yield, effective bits, word errors and power."""
    import flashplan as fp
    from flashplan.files import write_whole
    from flashplan.plan.axis import parse_axis
    from flashplan.report.sweep_files import sweep_csv, sweep_svg
    from flashplan.report.tables import sweep_table

    loaded, axes = fp.load_plan(plan), [parse_axis(text) for text in vary]
    if figure is not None and len(axes) > 2:
        raise InputError(f"a figure takes one or two axes, not {len(axes)}", "--figure")
    with _progress() as progress, _executor(workers, cluster) as executor:
        result = fp.run_sweep(
            loaded, axes, store=store, executor=executor, progress=progress
        )
    if csv is not None:
        write_whole(csv, sweep_csv(result))
    if figure is not None:
        write_whole(figure, sweep_svg(loaded, result))
    _emit(result.to_dict(), lambda: sweep_table(result), json, out)


@app.command()
def measure(
    codes: Annotated[
        Path,
        typer.Argument(
            metavar="CODES",
            help="CSV or .npy: one column of codes, or one per comparator",
        ),
    ],
    plan: Annotated[
        Path,
        typer.Option(
            "--plan", metavar="PLAN", help="plan file (TOML)", show_default=False
        ),
    ],
    json: AsJson = False,
    out: OutFile = None,
) -> None:
    """Metrics and diagnosis of captured codes."""
    import flashplan as fp
    from flashplan.report.tables import measure_table

    result = fp.measure_codes(codes, fp.load_plan(plan))
    _emit(result.to_dict(), lambda: measure_table(result), json, out)


@app.command()
def report(
    plan: PlanFile,
    out: Annotated[
        Path | None,
        typer.Option(
            "--out", metavar="FOLDER", help="default: reports/ and the plan's name"
        ),
    ] = None,
    workers: Workers = 1,
) -> None:
    """Everything in one folder: page, figures, JSON, CSV."""
    import flashplan as fp

    folder = Path("reports") / plan.stem if out is None else out
    with _progress() as progress, _executor(workers) as executor:
        written = fp.write_report(
            fp.load_plan(plan), folder, executor=executor, progress=progress
        )
    print(f"{written.headline}\nwrote {written.page}")
    _judge(written.met)


def _emit(
    document: dict[str, Any],
    table: Callable[[], "RenderableType"],
    json: bool,
    out: Path | None,
) -> None:
    """Print a table for people or the JSON document; write the document where asked."""
    from flashplan.files import as_json, write_whole

    text = as_json(document)
    if out is not None:
        write_whole(out, text)
    if json:
        sys.stdout.write(text)
    else:
        _print(table())
    sys.stdout.flush()


def _print(table: "RenderableType") -> None:
    from rich.console import Console

    Console(highlight=False).print(table)


def _executor(workers: int, cluster: str | None = None) -> Any:
    from flashplan.study.workers import study_executor

    return study_executor(workers, cluster)


def _progress() -> Any:
    from flashplan.study.progress import console_progress

    return console_progress()


def _judge(met: bool) -> None:
    if not met:
        raise typer.Exit(1)


def main() -> None:
    """Run the command line. Exit 0 done and met, 1 judged and not met, 2 bad input, 130 interrupted."""
    try:
        app()
    except InputError as error:
        print(f"flashplan: {error}", file=sys.stderr)
        sys.exit(2)
    except SystemExit as ending:
        if (
            ending.code == _INTERRUPTED
        ):  # the command-line library turns Ctrl-C into this, without a word
            print(
                "flashplan: interrupted; what a --store holds is kept", file=sys.stderr
            )
        raise
    except BrokenPipeError:
        # The reader has seen enough; closing stderr as well keeps the interpreter from complaining about it.
        sys.stderr.close()
        sys.exit(0)


if __name__ == "__main__":
    main()
