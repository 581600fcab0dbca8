"""Field types of the files that people write: quantities with a unit and a range."""

from dataclasses import dataclass
from typing import Any, get_args

from pydantic import BaseModel, ConfigDict, GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from flashplan.quantity import parse_quantity


class Table(BaseModel):
    """A frozen table of a file; a key that is not known is an error."""

    model_config = ConfigDict(extra="forbid", frozen=True, populate_by_name=True)


@dataclass(frozen=True)
class Unit:
    """Annotation of a float that a file may give in engineering notation, with its range in SI.

    >>> from typing import Annotated
    >>> class Example(Table):
    ...     rate: Annotated[float, Unit("Hz", gt=0)]
    >>> Example.model_validate({"rate": "2 GS/s"}).rate
    2000000000.0
    """

    unit: str
    gt: float | None = None
    ge: float | None = None
    lt: float | None = None
    le: float | None = None

    def __get_pydantic_core_schema__(
        self, source: Any, handler: GetCoreSchemaHandler
    ) -> CoreSchema:
        limits = {name: getattr(self, name) for name in ("gt", "ge", "lt", "le")}
        number = core_schema.float_schema(
            **{name: limit for name, limit in limits.items() if limit is not None}
        )
        return core_schema.no_info_before_validator_function(self._read, number)

    def _read(self, value: object) -> float:
        return parse_quantity(value, self.unit)


def unit_of(table: type[BaseModel], key: str) -> str:
    """Unit of a table's key as annotated, in one arm of a union too; "" where it has none.

    >>> from typing import Annotated
    >>> class Example(Table):
    ...     rate: Annotated[float, Unit("Hz", gt=0)] | None = None
    >>> unit_of(Example, "rate")
    'Hz'
    """
    field = table.model_fields[key]
    arms = [get_args(arm) for arm in get_args(field.annotation)]
    for item in (*field.metadata, *(part for arm in arms for part in arm)):
        if isinstance(item, Unit):
            return item.unit
    return ""
