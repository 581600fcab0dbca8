"""A sized cell: datasheet with the origin of each value, devices, what binds, and what stands in the way."""

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, get_args

import tomli_w

from flashplan.plan.datasheet import Datasheet
from flashplan.plan.fields import Unit
from flashplan.quantity import show


@dataclass(frozen=True)
class Origin:
    """How one value of the datasheet was obtained, and its interval where it has one (SI)."""

    how: str
    low: float | None = None
    high: float | None = None


@dataclass(frozen=True)
class SizedDevice:
    """A group of equal devices: width and length in m; `binds` names the limit that keeps it from being smaller.

    offset_sigma, noise_sigma in V and energy in J: what the whole group contributes.
    """

    name: str
    count: int
    width: float
    length: float
    binds: str
    offset_sigma: float
    noise_sigma: float
    energy: float


@dataclass(frozen=True)
class Relaxation:
    """A limit that no size was found to meet together with the others: what is allowed and what the cell needs.

    goal: the plan's keys that move it.
    """

    line: str
    goal: str
    limit: float
    needed: float

    @property
    def factor(self) -> float:
        """Needed over allowed; infinite for a limit of 0."""
        return self.needed / self.limit if self.limit > 0 else float("inf")


@dataclass(frozen=True)
class SizedCell:
    """Result of sizing; `met` against the limits given. parameters: sizes that are no devices, such as load resistance."""

    topology: str
    process: str
    met: bool
    datasheet: Datasheet
    origins: Mapping[str, Origin]
    devices: tuple[SizedDevice, ...]
    parameters: Mapping[str, float] = field(default_factory=dict)
    relaxations: tuple[Relaxation, ...] = ()
    failed_instances: int = 0
    notes: tuple[str, ...] = ()

    def to_dict(self) -> dict[str, Any]:
        """The JSON of the verb `size`."""
        return {
            "topology": self.topology,
            "process": self.process,
            "met": self.met,
            "datasheet": self.datasheet.model_dump(exclude_none=True),
            "provenance": {
                name: {"how": o.how, "low": o.low, "high": o.high}
                for name, o in self.origins.items()
            },
            "devices": [
                {
                    "name": d.name,
                    "count": d.count,
                    "width": d.width,
                    "length": d.length,
                    "binds": d.binds,
                    "offset_sigma": d.offset_sigma,
                    "noise_sigma": d.noise_sigma,
                    "energy": d.energy,
                }
                for d in self.devices
            ],
            "parameters": dict(self.parameters),
            "relax": [
                {
                    "line": r.line,
                    "goal": r.goal,
                    "limit": r.limit,
                    "needed": r.needed if math.isfinite(r.needed) else None,
                    "factor": r.factor if math.isfinite(r.factor) else None,
                }
                for r in self.relaxations
            ],
            "failed_instances": self.failed_instances,
            "notes": list(self.notes),
        }


def datasheet_toml(sized: SizedCell) -> str:
    """The cell's file: tables [datasheet], [devices] by group and [provenance] by value."""
    values = sized.datasheet.model_dump(exclude_none=True)
    document = {
        "datasheet": {name: _text(name, value) for name, value in values.items()},
        "devices": {
            "topology": sized.topology,
            "process": sized.process,
            **{
                d.name: {
                    "count": d.count,
                    "width": show(d.width, "m", 6),
                    "length": show(d.length, "m", 6),
                    "binds": d.binds,
                }
                for d in sized.devices
            },
            **dict(sized.parameters),
        },
        "provenance": {
            name: {
                "how": origin.how,
                **(
                    {}
                    if name not in values or origin.low is None or origin.high is None
                    else {
                        "low": _text(name, origin.low),
                        "high": _text(name, origin.high),
                    }
                ),
            }
            for name, origin in sized.origins.items()
        },
    }
    heading = (
        f"# {sized.topology} comparator sized in {sized.process}, generic values of no foundry;"
        " a planning estimate, not a sign-off.\n\n"
    )
    return heading + tomli_w.dumps(document)


def _text(name: str, value: float) -> str | float:
    unit = next(
        item.unit
        for kind in get_args(Datasheet.model_fields[name].annotation)
        for item in getattr(kind, "__metadata__", ())
        if isinstance(item, Unit)
    )
    return value if unit == "ratio" else show(value, unit, 6)
