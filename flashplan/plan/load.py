"""Plan and datasheet files read into validated objects; every message names the file and the key path."""

import tomllib
from collections.abc import Mapping
from difflib import get_close_matches
from pathlib import Path
from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from flashplan.errors import InputError
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

T = TypeVar("T", bound=BaseModel)

# Tables that a sized cell's file carries beside its datasheet: for people and for later runs, not read here.
_CELL_NOTES = ("devices", "provenance")


def load_plan(path: str | Path) -> Plan:
    """Read a plan file and the cell that it names.

    Raises InputError for a file that cannot be read, is not TOML, or says what no plan may say.
    """
    return plan_from_table(read_toml(path), source=str(path))


def plan_from_table(table: Mapping[str, Any], source: str = "plan") -> Plan:
    """Validate a plan given as nested mappings; `source` is the file that it came from and that a cell is relative to.

    Raises InputError.
    """
    hidden = {"datasheet", "source"} & set(table)
    if hidden:
        raise InputError(
            f"unknown key{nearest_key(min(hidden), Plan)}",
            f"{source}: {min(hidden)}",
        )
    plan = _validated(Plan, {**table, "source": source}, source)
    comparator = plan.comparator
    if comparator.cell is not None and comparator.datasheet is not None:
        raise InputError(
            "give a cell file or a table [comparator.datasheet], not both",
            f"{source}: comparator",
        )
    if comparator.cell is not None:
        file = Path(source).parent / comparator.cell
        if not file.is_file():
            raise InputError(
                f"there is no cell file {file}", f"{source}: comparator.cell"
            )
        plan = with_cell(plan, load_cell(file))
    elif comparator.datasheet is not None:
        plan = with_cell(plan, comparator.datasheet)
    _cross_check(plan)
    return plan


def load_cell(path: str | Path) -> Datasheet:
    """Read a comparator cell's datasheet file. Raises InputError."""
    table = read_toml(path)
    unknown = [key for key in table if key != "datasheet" and key not in _CELL_NOTES]
    if unknown:
        raise InputError(
            "unknown table; a cell file holds [datasheet]", f"{path}: {unknown[0]}"
        )
    if not isinstance(table.get("datasheet"), dict):
        raise InputError("missing table [datasheet]", str(path))
    return _validated(Datasheet, table["datasheet"], str(path), ("datasheet",))


def changed_plan(plan: Plan, changes: Mapping[str, Any]) -> Plan:
    """The same plan with the values at some key paths ("converter.bits") replaced, validated anew.

    A path below "comparator.datasheet" changes the plan's own copy of the cell. Raises InputError.
    """
    table = plan.model_dump(by_alias=True, exclude_none=True)
    if any(path.startswith("comparator.datasheet.") for path in changes):
        table["comparator"] = {
            "datasheet": plan.datasheet.model_dump(exclude_none=True)
        }
    for path, value in changes.items():
        place: dict[str, Any] = table
        *parents, key = path.split(".")
        for parent in parents:
            inner = place.setdefault(parent, {})
            if not isinstance(inner, dict):
                raise InputError(f"{parent!r} is not a table", f"{plan.source}: {path}")
            place = inner
        place[key] = value
    changed = plan_from_table(table, plan.source)
    if any(path.startswith("comparator.") for path in changes):
        return changed
    return with_cell(changed, plan.datasheet)


def with_cell(plan: Plan, cell: Datasheet) -> Plan:
    """The same plan with another cell."""
    return plan.model_copy(update={"datasheet": cell})


def read_toml(path: str | Path) -> dict[str, Any]:
    """Read a TOML file, which never executes it. Raises InputError that names the file."""
    try:
        return tomllib.loads(Path(path).read_text(encoding="utf-8"))
    except OSError as error:
        raise InputError(
            f"cannot read the file: {error.strerror or error}", str(path)
        ) from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise InputError(f"not a TOML file: {error}", str(path)) from None


def _validated(
    model: type[T], table: Mapping[str, Any], source: str, above: tuple[str, ...] = ()
) -> T:
    try:
        return model.model_validate(table)
    except ValidationError as error:
        raise InputError(*_message(error, model, source, above)) from None


def _message(
    error: ValidationError, model: type[BaseModel], source: str, above: tuple[str, ...]
) -> tuple[str, str]:
    """The first thing wrong with a file, and where; how many more there are."""
    problems: dict[tuple[int | str, ...], list[ErrorDetails]] = {}
    for item in error.errors(include_url=False):
        problems.setdefault(_key_path(item["loc"], model), []).append(item)
    # A misspelt key is missing as well: the spelling is what to tell.
    path, items = min(
        problems.items(), key=lambda found: found[1][0]["type"] != "extra_forbidden"
    )
    kind, found = items[0]["type"], items[0]["input"]
    if kind == "extra_forbidden":
        text = f"unknown key{nearest_key(str(path[-1]), _table_at(model, path[:-1]))}"
    elif kind == "missing":
        text = "missing key"
    elif kind in ("model_type", "model_attributes_type"):
        text = f"expected a table, found {found!r}"
    elif kind == "value_error":
        text = items[0]["msg"].removeprefix("Value error, ")
    else:
        wanted = dict.fromkeys(
            i["msg"].removeprefix("Input should be ").removeprefix("Value error, ")
            for i in items
        )
        text = f"must be {' or '.join(wanted)}; found {found!r}"
    if len(problems) > 1:
        text += f" (and {len(problems) - 1} more to mend after this)"
    return text, f"{source}: {'.'.join((*above, *map(str, path)))}" if path else source


def _key_path(
    loc: tuple[int | str, ...], model: type[BaseModel]
) -> tuple[int | str, ...]:
    """Keys of the file only: a union's branch names, which pydantic adds, are left out."""
    table: type[BaseModel] | None = model
    path: list[int | str] = []
    for part in loc:
        if table is None and not isinstance(part, int):
            break
        path.append(part)
        table = _table_at(table, (part,)) if table is not None else None
    return tuple(path)


def _table_at(
    model: type[BaseModel] | None, path: tuple[int | str, ...]
) -> type[BaseModel] | None:
    for part in path:
        if model is None:
            return None
        field = next(
            (f for name, f in model.model_fields.items() if part in (name, f.alias)),
            None,
        )
        kinds = (
            []
            if field is None
            else [field.annotation, *getattr(field.annotation, "__args__", ())]
        )
        model = next(
            (
                kind
                for kind in kinds
                if isinstance(kind, type) and issubclass(kind, BaseModel)
            ),
            None,
        )
    return model


def nearest_key(key: str, model: type[BaseModel] | None) -> str:
    """End of the message about an unknown key: the nearest known one of that table, or all of them."""
    if model is None:
        return ""
    known = [
        field.alias or name
        for name, field in model.model_fields.items()
        if not field.exclude
    ]
    close = get_close_matches(key, known, n=1, cutoff=0.5)
    return (
        f"; the nearest known one is {close[0]!r}"
        if close
        else f"; known here: {', '.join(known)}"
    )


def _cross_check(plan: Plan) -> None:
    """What no single key can tell."""
    converter, where = plan.converter, f"{plan.source}: "
    if converter.architecture != "flash":
        raise InputError(
            "subranging converters cannot be planned yet; only 'flash' can",
            where + "converter.architecture",
        )
    if plan.goals.enob > converter.bits:
        raise InputError(
            f"{plan.goals.enob:g} effective bits cannot come from {converter.bits} bits",
            where + "goals.enob",
        )
    beyond = [tap for tap in plan.ladder.forced_taps if tap > plan.comparators]
    if beyond:
        raise InputError(
            f"tap {beyond[0]} is beyond the last one; {converter.bits} bits have taps 1 to {plan.comparators}",
            where + "ladder.forced_taps",
        )
    if plan.allocation.systematic_lsb >= min(plan.goals.dnl_lsb, plan.goals.inl_lsb):
        raise InputError(
            "leaves nothing of goals.dnl_lsb and goals.inl_lsb for random errors; make it smaller than both",
            where + "allocation.systematic_lsb",
        )
