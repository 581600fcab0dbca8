"""What is asked: plan and datasheet files as typed, validated objects."""

from flashplan.plan.datasheet import Datasheet
from flashplan.plan.load import (
    changed_plan,
    load_cell,
    load_plan,
    plan_from_table,
    with_cell,
)
from flashplan.plan.model import Plan

__all__ = [
    "Datasheet",
    "Plan",
    "changed_plan",
    "load_cell",
    "load_plan",
    "plan_from_table",
    "with_cell",
]
