"""Terminal tables of each verb's result."""

import numpy as np
from rich.console import Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from flashplan.array.result import ArrayResult
from flashplan.budget.explain import Explanation
from flashplan.budget.result import Budget, BudgetLine
from flashplan.cell.check import Verdict, VerdictLine
from flashplan.decoder import DecoderTable, rank
from flashplan.decoder.compare import Order
from flashplan.ladder import LadderResult, effects
from flashplan.measure import MeasureResult
from flashplan.plan.model import Plan
from flashplan.quantity import show
from flashplan.report.words import (
    CAUTION,
    goal_rows,
    headline,
    ladder_sentence,
    line_origin,
    verdict_sentence,
)
from flashplan.sweep import SweepResult

_MARK = {True: "met", False: "MISSED", None: "not judged"}
_STYLE = {True: "green", False: "bold red", None: "yellow"}


def mark(met: bool | None) -> Text:
    """The word for a verdict, in its colour."""
    return Text(_MARK[met], style=_STYLE[met])


def budget_table(budget: Budget) -> RenderableType:
    """Limits with shares, then the formula and source of each."""
    converter = budget.plan.converter
    table = plain_table("quantity", "limit", "in LSB", "share", "set by")
    for line in budget.lines.values():
        table.add_row(
            line.name,
            _limit(line),
            _in_lsb(line, budget.lsb),
            _share(line.share),
            line_origin(line),
        )
    origins: list[RenderableType] = [Text()]
    for line in budget.lines.values():
        origins.append(Text.assemble((line.name, "bold"), " = ", line.formula))
        origins.append(Padding(Text(line.source, style="dim"), (0, 0, 0, 4)))
        if line.note:
            origins.append(Padding(Text(line.note, style="dim"), (0, 0, 0, 4)))
    title = Text(
        f"{converter.name}: {converter.bits} bits, {show(converter.sample_rate, 'Hz')}, {budget.comparators} comparators,"
        f" LSB {show(budget.lsb, 'V')}\n"
        f"error power: {budget.ideal_error_lsb2:.4f} LSB^2 ideal, {budget.allowed_error_lsb2:.4f} LSB^2 allowed"
        f" by {budget.plan.goals.enob:g} effective bits"
    )
    return Group(title, table, *origins, caution())


def explanation_table(explanation: Explanation) -> RenderableType:
    """One line with its inputs and what moves it."""
    line = explanation.line
    inputs = plain_table("input", "value")
    for name, given in line.inputs.items():
        value = (
            given.value
            if isinstance(given.value, str)
            else show(given.value, given.unit)
        )
        inputs.add_row(name, value)
    moves = plain_table("limit moves with", "percent per percent")
    for s in explanation.sensitivities:
        moves.add_row(s.key, f"{s.elasticity:+.3g}")
    head = [
        Text.assemble((line.name, "bold"), f" at most {_limit(line)}"),
        Text(f"formula: {line.formula}"),
        Text(f"source: {line.source}"),
    ]
    if line.candidates:
        held = ", ".join(
            f"{name} {show(value, line.unit)}"
            for name, value in line.candidates.items()
        )
        head.append(Text(f"candidates: {held}; set by {line.binding}"))
    if line.note:
        head.append(Text(f"note: {line.note}"))
    return Group(*head, inputs, moves)


def verdict_table(verdict: Verdict) -> RenderableType:
    """Limit, value and margin of each quantity, the verdict first."""
    table = plain_table("quantity", "limit", "value", "margin", "", "verdict")
    for line in verdict.lines.values():
        known = (
            line.margin is not None
            and line.limit is not None
            and line.value is not None
        )
        table.add_row(
            line.name,
            show(line.limit, line.unit),
            show(line.value, line.unit),
            show(_difference(line), line.unit, 3) if known else "-",
            f"{line.margin:+.1%}" if line.margin is not None else "-",
            mark(line.met),
        )
    notes = [
        Text(f"{line.name}: {line.note}", style="dim")
        for line in verdict.lines.values()
        if line.note
    ]
    return Group(
        Text(verdict_sentence(verdict), style=_STYLE[verdict.met]),
        table,
        *notes,
        caution(),
    )


def _difference(line: VerdictLine) -> float:
    """Limit less value; what is only rounding is nothing."""
    assert line.limit is not None
    assert line.value is not None
    return 0.0 if abs(line.margin or 0.0) < 1e-9 else line.limit - line.value


def ladder_table(result: LadderResult) -> RenderableType:
    """Worst tap of each effect."""
    table = plain_table("effect", "largest error", "at tap", "rms over taps")
    for name, errors in effects(result).items():
        if errors is None:
            table.add_row(name, "not known", "-", "-")
            continue
        worst = int(abs(errors).argmax())
        rms = float((abs(errors) ** 2).mean() ** 0.5)
        table.add_row(
            name,
            show(float(errors[worst]), "lsb", 3),
            str(worst + 1),
            show(rms, "lsb", 3),
        )
    return Group(Text(ladder_sentence(result)), table, caution())


def array_table(plan: Plan, result: ArrayResult) -> RenderableType:
    """Goals first, then what was simulated."""
    goals = plain_table("goal", "asked", "reached", "verdict")
    for row in goal_rows(plan, result):
        goals.add_row(row.name, row.asked, row.reached, mark(row.met))
    facts = plain_table("quantity", "value", "interval or spread over arrays")
    if result.static is not None:
        s = result.static
        facts.add_row(
            f"yield of {s.arrays} drawn arrays",
            f"{s.passed / s.arrays:.4f}",
            f"{s.yield_interval.low:.4f} to {s.yield_interval.high:.4f} (95 %)",
        )
        facts.add_row("exact yield", f"{s.exact_yield:.6f}", "to quadrature")
        summary = s.to_dict()
        for key, name in (("dnl_lsb", "largest |DNL|"), ("inl_lsb", "largest |INL|")):
            p = summary[key]
            facts.add_row(
                name,
                f"{p['p50']:.3f} LSB median",
                f"95 % of arrays below {p['p95']:.3f} LSB",
            )
    if result.dynamic is not None:
        d = result.dynamic
        facts.add_row(
            "input",
            show(d.frequency, "Hz", 6),
            f"{d.arrays} arrays of {d.samples} samples",
        )
        facts.add_row("SNDR", f"{d.sndr_db:.2f} dB", "mean error power")
        facts.add_row("SFDR", f"{d.sfdr_db:.1f} dB", "mean over arrays")
        facts.add_row(
            "ENOB",
            f"{d.enob:.3f}",
            f"{d.enob_interval.low:.3f} to {d.enob_interval.high:.3f} (95 %)",
        )
        facts.add_row(
            f"ENOB of {plan.goals.yield_:.4g} of arrays",
            f"{d.enob_low:.3f}",
            f"{d.enob_low_interval.low:.3f} to {d.enob_low_interval.high:.3f} (95 %)",
        )
        facts.add_row(
            "words with a bubble",
            f"{d.bubble_rate:.3g}",
            f"{d.bubble_rate_interval.low:.2g} to {d.bubble_rate_interval.high:.2g} (95 %)",
        )
        orders = ", ".join(
            f"{count} of order {order}"
            for order, count in sorted(d.bubbles_by_order.items())
        )
        facts.add_row(
            "bubbles", orders or "none seen", f"in {d.arrays * d.samples} conversions"
        )
    if result.word_error_rate is not None:
        facts.add_row(
            "word error rate",
            f"{result.word_error_rate:.3g}",
            "closed form, per conversion",
        )
    for name, value in result.power.items():
        facts.add_row(
            f"power: {name}", show(value, "W"), "" if value is not None else "not known"
        )
    notes = [Text(headline(plan, result), style="bold")]
    if result.left_out:
        notes.append(
            Text(
                f"left out, since the datasheet does not give it: {', '.join(result.left_out)}",
                style="yellow",
            )
        )
    return Group(*notes, goals, facts, caution())


def decoder_table(decoders: DecoderTable, order: Order) -> RenderableType:
    """All schemes on the same words, best first by the chosen order, and which one to take."""
    table = plain_table(
        "scheme",
        "transistors",
        "depth",
        "toggles",
        "rms",
        "max",
        "undecided",
        "max",
        "fits",
    )
    for row in rank(decoders.schemes, order):
        table.add_row(
            row.name,
            str(row.transistors),
            str(row.depth),
            _number(row.transitions),
            _number(row.rms_error_lsb),
            str(row.max_error_lsb),
            _number(row.undecided_rms_error_lsb),
            ("" if row.undecided_exact else ">=") + str(row.undecided_max_error_lsb),
            Text("yes", style="green")
            if row.good_enough
            else Text("no", style="yellow"),
        )
    return Group(
        Text(decoders.sentence, style="bold"),
        table,
        Text(
            "errors in LSB, rms and largest, over all words and given an undecided comparator;"
            " toggles: gate outputs that change per word",
            style="dim",
        ),
        caution(),
    )


def measure_table(result: MeasureResult) -> RenderableType:
    """What the record holds, its figures, and which errors explain it."""
    facts = plain_table("quantity", "value")
    facts.add_row(
        "samples",
        f"{result.samples}, {result.cycles:.6g} cycles"
        + ("" if result.coherent else ", not coherent"),
    )
    facts.add_row(
        "input",
        f"{show(result.frequency, 'Hz', 6)}, amplitude {result.amplitude_lsb:.4g} LSB",
    )
    facts.add_row("SNDR", f"{result.sndr_db:.2f} dB")
    facts.add_row("SFDR", f"{result.sfdr_db:.1f} dB")
    facts.add_row("ENOB", f"{result.enob:.3f}")
    facts.add_row(
        "largest |DNL|",
        f"{np.nanmax(np.abs(result.dnl_lsb)):.3f} LSB ({result.linearity_fit} line)",
    )
    facts.add_row(
        "largest |INL|",
        f"{np.nanmax(np.abs(result.inl_lsb)):.3f} LSB ({result.linearity_fit} line)",
    )
    found = plain_table("explained by", "value", "95 % interval", "limit", "verdict")
    for name, finding in result.diagnosis.items():
        found.add_row(
            name,
            show(finding.value, finding.unit, 3),
            f"{show(finding.low, finding.unit, 3)} to {show(finding.high, finding.unit, 3)}",
            show(finding.limit, finding.unit, 3),
            Text("open", style="yellow") if finding.met is None else mark(finding.met),
        )
    broken = [
        name for name, finding in result.diagnosis.items() if finding.met is False
    ]
    if broken:
        first = Text(f"Broken: {', '.join(broken)}.", style="bold red")
    elif result.diagnosis:
        first = Text("No budget line is shown to be broken.", style="green")
    elif result.rebuilt:
        first = Text(
            "Codes alone cannot tell what explains them: give one column per comparator.",
            style="yellow",
        )
    else:
        first = Text(
            "Too few thresholds were reached to tell what explains the codes.",
            style="yellow",
        )
    return Group(first, facts, *([found] if result.diagnosis else []), caution())


def sweep_table(result: SweepResult) -> RenderableType:
    """One row a point; a goal that is missed is marked."""
    table = plain_table(
        *(axis.key.split(".")[-1] for axis in result.axes),
        "yield",
        "ENOB",
        "word errors",
        "power",
        "goals",
    )
    for point in result.points:
        varied = [show(point.vary[axis.key], axis.unit) for axis in result.axes]
        if point.refused:
            table.add_row(
                *varied, "-", "-", "-", "-", Text("impossible", style="yellow")
            )
            continue
        missed = [name for name, met in point.goals_met.items() if met is False]
        open_ = None in point.goals_met.values()
        verdict = (
            Text(f"misses {', '.join(missed)}", style="red")
            if missed
            else mark(None if open_ else True)
        )
        table.add_row(
            *varied,
            _number(point.yield_),
            _number(point.enob_low),
            _number(point.word_error_rate),
            show(point.power, "W"),
            verdict,
        )
    reasons = dict.fromkeys(point.refused for point in result.points if point.refused)
    return Group(
        table,
        *(Text(f"impossible: {reason}", style="yellow") for reason in reasons),
        caution(),
    )


def plain_table(*columns: str) -> Table:
    """An empty table in the house style."""
    table = Table(box=None, pad_edge=False, header_style="bold", padding=(0, 2, 0, 0))
    for index, column in enumerate(columns):
        table.add_column(column, overflow="fold", no_wrap=index == 0)
    return table


def _limit(line: BudgetLine) -> str:
    return "not limited" if line.limit is None else show(line.limit, line.unit)


def _in_lsb(line: BudgetLine, lsb: float) -> str:
    return (
        f"{line.limit / lsb:.3g}" if line.unit == "V" and line.limit is not None else ""
    )


def _share(share: float | None) -> str:
    return "" if share is None else f"{share:.0%}"


def _number(value: float | None) -> str:
    return "-" if value is None else f"{value:.3g}"


def caution() -> RenderableType:
    """The caution under every table."""
    return Text(CAUTION, style="dim")
