"""Terminal tables of sized cells."""

from collections.abc import Sequence

from rich.console import Group, RenderableType
from rich.text import Text

from flashplan.cell.sized import SizedCell
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.fields import unit_of
from flashplan.quantity import show
from flashplan.report.tables import caution, plain_table


def sized_table(cell: SizedCell) -> RenderableType:
    """Datasheet with the origin of each value, then the devices and what binds them."""
    values = plain_table("quantity", "value", "interval", "how")
    for name, value in cell.datasheet.model_dump(exclude_none=True).items():
        origin, unit = cell.origins.get(name), unit_of(Datasheet, name)
        interval = ""
        if origin is not None and origin.low is not None and origin.high is not None:
            interval = f"{show(origin.low, unit, 3)} to {show(origin.high, unit, 3)}"
        values.add_row(
            name, show(value, unit, 3), interval, "" if origin is None else origin.how
        )
    devices = plain_table("devices", "count", "width", "length", "bound by")
    for device in cell.devices:
        devices.add_row(
            device.name,
            str(device.count),
            show(device.width, "m", 3),
            show(device.length, "m", 3),
            device.binds,
        )
    notes = [Text(note, style="dim") for note in cell.notes]
    if cell.failed_instances:
        notes.append(
            Text(
                f"{cell.failed_instances} instances of the bench failed and are left out",
                style="yellow",
            )
        )
    return Group(
        Text(sized_sentence(cell), style="green" if cell.met else "bold red"),
        values,
        devices,
        *notes,
        caution(),
    )


def topologies_table(cells: Sequence[SizedCell]) -> RenderableType:
    """All topologies side by side."""
    table = plain_table(
        "topology",
        "offset",
        "noise",
        "tau",
        "delay",
        "energy",
        "area",
        "meets the budget",
    )
    for cell in cells:
        sheet = cell.datasheet
        table.add_row(
            cell.topology,
            show(sheet.offset_sigma, "V", 3),
            show(sheet.noise_sigma, "V", 3),
            show(sheet.regeneration_tau, "s", 3),
            show(sheet.delay, "s", 3),
            show(sheet.energy, "J", 3),
            show(sheet.area, "m2", 3),
            Text("yes", style="green") if cell.met else Text("no", style="red"),
        )
    return Group(table, *(Text(sized_sentence(cell)) for cell in cells), caution())


def sized_sentence(cell: SizedCell) -> str:
    """Whether the cell meets the budget, or which goal is in the way and by how much."""
    name = f"{cell.topology} in {cell.process}"
    if cell.met:
        return f"{name} meets every line of the budget."
    ways = "; ".join(
        f"{r.line} would have to be relaxed from {show(r.limit, unit_of(Datasheet, r.line), 3)}"
        f" to {show(r.needed, unit_of(Datasheet, r.line), 3)} (moved by {r.goal})"
        for r in cell.relaxations
    )
    return f"{name}: no size meets the plan. {ways}."
