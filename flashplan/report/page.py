"""The page: sections with figures and tables, the answer first, rendered from one template."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from importlib.metadata import version
from importlib.resources import files
from typing import TYPE_CHECKING

import numpy as np
from jinja2 import Environment
from matplotlib.figure import Figure

from flashplan.budget.reference import moving_room
from flashplan.budget.result import BudgetLine, Input
from flashplan.budget.room import error_room
from flashplan.decoder import fault_maps, rank
from flashplan.ladder.advice import advise
from flashplan.ladder.tradeoff import trade_off
from flashplan.ladder.transients import code_step, worst_disturbance
from flashplan.quantity import show
from flashplan.report import array_figures, decoder_figures, ladder_figures
from flashplan.report.drawing import as_svg
from flashplan.report.published import CITATION
from flashplan.report.published_figure import published_figure
from flashplan.report.words import (
    CAUTION,
    goal_rows,
    headline,
    ladder_sentence,
    line_origin,
    reasons,
    verdict_sentence,
)

if TYPE_CHECKING:
    from flashplan.report.write import Results

_WORD = {True: "met", False: "missed", None: "not judged"}
# Larger arrays show the same pattern, and every position is tried.
_FAULT_MAP_BITS = 6
_CLASS = {"met": "met", "missed": "missed", "not judged": "open"}


@dataclass(frozen=True)
class Drawn:
    """A figure of the page: its file name, SVG text and caption."""

    name: str
    svg: str
    caption: str


@dataclass(frozen=True)
class Section:
    """One part of the page."""

    title: str
    text: str = ""
    figures: Sequence[Drawn] = ()
    columns: Sequence[str] = ()
    rows: Sequence[Sequence[str]] = ()
    origins: Sequence[BudgetLine] = field(default=())


def render_page(results: "Results", sections: Sequence[Section]) -> str:
    """The whole page as one HTML text that links to nothing outside itself."""
    environment = Environment(autoescape=True, trim_blocks=True, lstrip_blocks=True)
    template = environment.from_string(
        files("flashplan.report").joinpath("page.html").read_text(encoding="utf-8")
    )
    plan, met = results.plan, results.array.goals_met.values()
    converter = plan.converter
    return template.render(
        plan=plan,
        subtitle=f"{converter.bits} bits, {show(converter.sample_rate, 'Hz')}, {plan.comparators} comparators,"
        f" full scale {show(converter.full_scale, 'V')}, LSB {show(plan.lsb, 'V')}",
        headline=headline(plan, results.array)
        .removeprefix(f"{converter.name}: ")
        .capitalize(),
        missed=False in met,
        unknown=None in met,
        limits_sentence=" ".join(
            [
                verdict_sentence(results.verdict),
                *reasons(results.array, results.verdict),
            ]
        ),
        goals=goal_rows(plan, results.array),
        left_out=results.array.left_out,
        caution=CAUTION,
        sections=sections,
        version=version("flashplan"),
        verdict_word=_WORD.__getitem__,
        verdict_class=lambda value: _CLASS[_WORD[value]],
        verdict_class_of=lambda cell: _CLASS.get(cell, ""),
        show_input=_show_input,
    )


def page_sections(results: "Results") -> list[Section]:
    """The sections of the page, in the order of the rooms; parts that could not be worked out are left out."""
    return [
        _budget(results),
        _ladder(results),
        *_static(results),
        *_dynamic(results),
        _decoders(results),
        _placement(results),
    ]


def _drawn(name: str, figure: Figure, caption: str) -> Drawn:
    return Drawn(name, as_svg(figure), caption)


def _budget(results: "Results") -> Section:
    rows = []
    for line in results.budget.lines.values():
        judged = results.verdict.lines[line.name]
        rows.append(
            (
                line.name,
                "not limited" if line.limit is None else show(line.limit, line.unit),
                show(judged.value, line.unit),
                "-" if judged.margin is None else f"{judged.margin:+.1%}",
                _WORD[judged.met],
                "" if line.share is None else f"{line.share:.0%}",
                line_origin(line),
            )
        )
    return Section(
        "What limits, and by how much",
        "",
        [
            _drawn(
                "margins",
                array_figures.margin_figure(results.verdict),
                "Each value of cell, clock and ladder as a part of its limit. Right of the line: broken.",
            )
        ],
        ("quantity", "limit", "value", "margin", "verdict", "share", "set by"),
        rows,
        list(results.budget.lines.values()),
    )


def _ladder(results: "Results") -> Section:
    ladder, plan, cell = results.ladder, results.plan, results.plan.datasheet
    resistance = ladder.total_resistance
    figures = [
        _drawn(
            "ladder",
            ladder_figures.tap_error_figure(ladder),
            "Error of each tap by effect: what stays (lead, bias, kickback at rest), what scatters (mismatch, one sigma)"
            " and what the input moves (feedthrough amplitude).",
        )
    ]
    disturbance = worst_disturbance(plan, cell, resistance)
    if disturbance is not None:
        figures.append(
            _drawn(
                "disturbance",
                ladder_figures.disturbance_figure(disturbance),
                "Kickback in time at the tap that it moves most, in periodic steady state.",
            )
        )
    step = code_step(plan, cell, resistance)
    if step is not None:
        figures.append(
            _drawn(
                "step",
                ladder_figures.step_map_figure(step),
                "All taps after a full-scale step of the input.",
            )
        )
    trade = trade_off(plan, cell, np.geomspace(resistance / 8, resistance * 8, 33))
    room = moving_room(plan, error_room(plan))
    figures.append(
        _drawn(
            "tradeoff",
            ladder_figures.tradeoff_figure(
                trade, plan.allocation.systematic_lsb, room, resistance
            ),
            "What each effect takes of its room against the total resistance, and the reference power; marked: this plan.",
        )
    )
    rows = [
        (
            change.name,
            *(
                show(value, "lsb", 3)
                for value in (
                    change.kickback_lsb,
                    change.feedthrough_lsb,
                    change.noise_lsb,
                )
            ),
            f"{change.moving_lsb2:.3g}",
        )
        for change in advise(plan, cell, resistance)
    ]
    return Section(
        "Reference ladder",
        ladder_sentence(ladder),
        figures,
        (
            "what would help",
            "kickback",
            "feedthrough",
            "noise",
            "moving error power [LSB^2]",
        ),
        rows,
    )


def _static(results: "Results") -> list[Section]:
    static, plan = results.array.static, results.plan
    if static is None:
        return []
    drawn = static.passed / static.arrays
    text = (
        f"Exact yield {static.exact_yield:.6g}; {drawn:.4f} of {static.arrays} drawn arrays pass"
        f" ({static.yield_interval.low:.4f} to {static.yield_interval.high:.4f} at 95 %)."
        f" The reference line is {plan.goals.linearity_fit!r}."
    )
    return [
        Section(
            "Linearity",
            text,
            [
                _drawn(
                    "linearity",
                    array_figures.linearity_figure(plan, static),
                    "DNL and INL at each code over arrays.",
                ),
                _drawn(
                    "worst",
                    array_figures.worst_figure(plan, static),
                    "Largest DNL and INL of each drawn array.",
                ),
            ],
        )
    ]


def _dynamic(results: "Results") -> list[Section]:
    dynamic, plan = results.array.dynamic, results.plan
    if dynamic is None:
        return []
    text = (
        f"At {show(dynamic.frequency, 'Hz')}: SNDR {dynamic.sndr_db:.2f} dB and SFDR {dynamic.sfdr_db:.1f} dB in the mean,"
        f" {dynamic.enob:.3f} effective bits; {plan.goals.yield_:.4g} of arrays reach {dynamic.enob_low:.3f}"
        f" ({dynamic.enob_low_interval.low:.3f} to {dynamic.enob_low_interval.high:.3f} at 95 %)."
        f" {dynamic.bubble_rate:.3g} of all words have a bubble."
    )
    return [
        Section(
            "Dynamic run",
            text,
            [
                _drawn(
                    "spectrum",
                    array_figures.spectrum_figure(plan, dynamic),
                    "Mean spectrum of a full-scale sine.",
                ),
                _drawn(
                    "bubbles",
                    array_figures.bubble_figure(dynamic),
                    "Bubbles in the thermometer words, by order.",
                ),
            ],
        )
    ]


def _decoders(results: "Results") -> Section:
    table, bits = results.decoders, results.plan.converter.bits
    maps = fault_maps(min(bits, _FAULT_MAP_BITS))
    rows = [
        (
            scheme.name,
            str(scheme.transistors),
            str(scheme.depth),
            f"{scheme.rms_error_lsb:.3g}",
            str(scheme.max_error_lsb),
            f"{scheme.wrong_word_rate:.2g}",
            f"{scheme.undecided_rms_error_lsb:.3g}",
            ("" if scheme.undecided_exact else ">= ")
            + str(scheme.undecided_max_error_lsb),
            "good enough" if scheme.good_enough else "costs more",
        )
        for scheme in rank(table.schemes, "error")
    ]
    return Section(
        "Decoders",
        table.sentence + " All schemes decode the same thermometer words, best first;"
        " errors in LSB against the number of thresholds passed.",
        [
            _drawn(
                "decoders",
                decoder_figures.ranking_figure(table),
                "Error and size of each scheme on this array's words.",
            ),
            _drawn(
                "faults",
                decoder_figures.fault_map_figure(maps),
                f"What a bubble costs each scheme by its order and distance from the edge, at {maps.bits} bits: "
                "the worst over all edges.",
            ),
        ],
        (
            "scheme",
            "transistors",
            "depth",
            "rms error",
            "max error",
            "wrong words",
            "undecided rms",
            "max",
            "verdict",
        ),
        rows,
    )


def _placement(results: "Results") -> Section:
    array, plan = results.array, results.plan
    known = [
        value
        for name, value in array.power.items()
        if name != "total" and value is not None
    ]
    power = (
        array.power["total"]
        if array.power["total"] is not None
        else (sum(known) or None)
    )
    missing = [
        name for name, value in array.power.items() if name != "total" and value is None
    ]
    enob = None if array.dynamic is None else array.dynamic.enob
    caption = f"Published figures: {CITATION}."
    if missing:
        caption += (
            f" The plan's energy leaves out what is not known: {', '.join(missing)}."
        )
    return Section(
        "Among published converters",
        "",
        [
            _drawn(
                "published",
                published_figure(plan.converter.sample_rate, power, enob),
                caption,
            )
        ],
    )


def _show_input(given: Input) -> str:
    return (
        given.value if isinstance(given.value, str) else show(given.value, given.unit)
    )
