"""Plans that tests share."""

import tomllib
from typing import Any

from flashplan.plan import Plan, plan_from_table
from flashplan.plan.starter import starter_text


def starter_plan(**tables: dict[str, Any]) -> Plan:
    """The starter plan with some keys of some tables changed."""
    table = tomllib.loads(starter_text())
    for name, changes in tables.items():
        table.setdefault(name, {}).update(changes)
    return plan_from_table(table, "starter.toml")
