"""A sweep as CSV and as SVG."""

from flashplan.files import as_csv
from flashplan.plan.model import Plan
from flashplan.report.drawing import as_svg
from flashplan.report.sweep_figure import sweep_figure
from flashplan.sweep import SweepResult


def sweep_csv(result: SweepResult) -> str:
    """One line a point: the varied keys in SI, then what was reached."""
    keys = [axis.key for axis in result.axes]
    goals = ("linearity", "enob", "word_error_rate")
    columns = [
        *keys,
        "yield",
        "enob_low",
        "word_error_rate",
        "power_w",
        *(f"{goal}_met" for goal in goals),
        "refused",
    ]
    rows = [
        [
            *(point.vary[key] for key in keys),
            point.yield_,
            point.enob_low,
            point.word_error_rate,
            point.power,
            *(point.goals_met[goal] for goal in goals),
            point.refused,
        ]
        for point in result.points
    ]
    return as_csv(columns, rows)


def sweep_svg(plan: Plan, result: SweepResult) -> str:
    """The figure of one or two axes."""
    return as_svg(sweep_figure(plan, result))
