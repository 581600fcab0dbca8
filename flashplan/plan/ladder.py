"""The ladder's table of a plan: the string, how it is laid out, and what feeds it."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from flashplan.errors import InputError
from flashplan.plan.fields import Table, Unit


class Ladder(Table):
    """The reference ladder that the comparators hang on; the defaults are one straight string on ideal references.

    total_resistance: of the 2**bits units of one string; leads and turns come on top, a coarse string beside it.
    end_resistance, lead_inductance: of each reference lead; reference_resistance: what each reference itself adds;
    decoupling_capacitance: to ground at each end of the string, behind the lead.
    forced_taps are held at their ideal voltage through forced_resistance each.
    rows: the string is folded into that many rows; each turn adds turn_resistance.
    gradient_linear: relative change of a unit's resistance from one end of a row to the other; gradient_quadratic:
    relative rise of a unit at both ends of a row over one in its middle.
    coarse_segments: a second string of that many resistors in parallel, tied to the first at equal steps; coarse_ratio:
    its resistance against total_resistance; coarse_sigma: relative sigma of one of its resistors.
    differential: two strings, upside down to each other, each over half the full scale.
    """

    total_resistance: Literal["auto"] | Annotated[float, Unit("ohm", gt=0)] = "auto"
    resistor_sigma: Annotated[float, Unit("ratio", ge=0, lt=0.3)] = 0.0
    tap_capacitance: Annotated[float, Unit("F", gt=0)] = 10e-15
    end_resistance: Annotated[float, Unit("ohm", ge=0)] = 0.0
    forced_taps: tuple[Annotated[int, Field(ge=1, strict=True)], ...] = ()
    bias_current: Annotated[float, Unit("A")] = 0.0
    forced_resistance: Annotated[float, Unit("ohm", ge=0)] = 0.0
    reference_resistance: Annotated[float, Unit("ohm", ge=0)] = 0.0
    lead_inductance: Annotated[float, Unit("H", ge=0)] = 0.0
    decoupling_capacitance: Annotated[float, Unit("F", ge=0)] = 0.0
    rows: Annotated[int, Field(ge=1, strict=True)] = 1
    turn_resistance: Annotated[float, Unit("ohm", ge=0)] = 0.0
    gradient_linear: Annotated[float, Unit("ratio", gt=-1, lt=1)] = 0.0
    gradient_quadratic: Annotated[float, Unit("ratio", gt=-1, lt=1)] = 0.0
    coarse_segments: Annotated[int, Field(ge=0, strict=True)] = 0
    coarse_ratio: Annotated[float, Unit("ratio", gt=0)] | None = None
    coarse_sigma: Annotated[float, Unit("ratio", ge=0, lt=0.3)] = 0.0
    differential: Annotated[bool, Field(strict=True)] = False

    @model_validator(mode="after")
    def _fits_together(self) -> Self:
        if len(set(self.forced_taps)) < len(self.forced_taps):
            raise ValueError("forced_taps names a tap twice")
        if (self.coarse_segments > 0) != (self.coarse_ratio is not None):
            raise ValueError("coarse_segments and coarse_ratio come together")
        return self


def check_ladder(ladder: Ladder, bits: int, source: str) -> None:
    """Refuse what only the number of bits can tell, with an InputError that names the key path."""
    units = 2**bits
    where = f"{source}: ladder."
    beyond = [tap for tap in ladder.forced_taps if tap >= units]
    if beyond:
        raise InputError(
            f"tap {beyond[0]} is beyond the last one; {bits} bits have taps 1 to {units - 1}",
            where + "forced_taps",
        )
    if ladder.rows > units:
        raise InputError(
            f"{ladder.rows} rows cannot be made of {units} units", where + "rows"
        )
    if ladder.coarse_segments and units % ladder.coarse_segments:
        raise InputError(
            f"{units} units cannot be split evenly into {ladder.coarse_segments} segments",
            where + "coarse_segments",
        )
