"""The plan: what is asked of the converter, as typed, validated, frozen tables."""

from typing import Annotated, Literal, Self

from pydantic import Field, model_validator

from flashplan.plan.datasheet import Datasheet
from flashplan.plan.fields import Table, Unit
from flashplan.plan.ladder import Ladder

Scheme = Literal[
    "rom",
    "rom-3and",
    "gray-rom",
    "majority-rom",
    "ones-counter",
    "mux-tree",
    "fat-tree",
    "gray-logic",
    "folded-adder",
    "sorted-rom",
]
Topology = Literal["single-tail", "double-tail", "preamp-latch", "three-stage"]


class Converter(Table):
    """The converter around the array."""

    name: str = "unnamed converter"
    architecture: Literal["flash", "subranging"] = "flash"
    bits: Annotated[int, Field(ge=2, le=12, strict=True)]
    sample_rate: Annotated[float, Unit("Hz", gt=0)]
    input_frequency: Annotated[float, Unit("Hz", gt=0)]
    full_scale: Annotated[float, Unit("V", gt=0)]
    supply: Annotated[float, Unit("V", gt=0)]
    decision_fraction: Annotated[float, Unit("ratio", gt=0, le=1)] = 0.5
    latch_stages: Annotated[int, Field(ge=0, le=8, strict=True)] = 0
    source_resistance: Annotated[float, Unit("ohm", gt=0)] | None = None


class Goals(Table):
    """What an accepted part must reach, and how many parts must."""

    dnl_lsb: Annotated[float, Unit("lsb", gt=0)] = 0.5
    inl_lsb: Annotated[float, Unit("lsb", gt=0)] = 0.5
    linearity_fit: Literal["none", "endpoint", "best"] = "endpoint"
    yield_: Annotated[float, Unit("ratio", gt=0, lt=1), Field(alias="yield")] = 0.99
    enob: Annotated[float, Unit("ratio", gt=0)]
    word_error_rate: Annotated[float, Unit("ratio", gt=0, lt=1)] = 1e-12


class Allocation(Table):
    """Shares of the error power beyond quantisation, and what is set aside before sharing."""

    offset: Annotated[float, Unit("ratio", ge=0, le=1)] = 0.40
    noise: Annotated[float, Unit("ratio", ge=0, le=1)] = 0.25
    hysteresis: Annotated[float, Unit("ratio", ge=0, le=1)] = 0.05
    skew: Annotated[float, Unit("ratio", ge=0, le=1)] = 0.10
    jitter: Annotated[float, Unit("ratio", ge=0, le=1)] = 0.10
    ladder: Annotated[float, Unit("ratio", ge=0, le=1)] = 0.10
    systematic_lsb: Annotated[float, Unit("lsb", ge=0)] = 0.1
    delay_fraction: Annotated[float, Unit("ratio", gt=0, lt=1)] = 0.3
    input_droop_db: Annotated[float, Unit("db", gt=0, le=3)] = 0.1

    @model_validator(mode="after")
    def _sum(self) -> Self:
        total = (
            self.offset
            + self.noise
            + self.hysteresis
            + self.skew
            + self.jitter
            + self.ladder
        )
        if total > 1 + 1e-9:
            raise ValueError(
                f"the shares of offset, noise, hysteresis, skew, jitter and ladder sum to {total:.4g}; at most 1"
            )
        return self


class Clock(Table):
    """The sampling clock, common to all comparators."""

    jitter_sigma: Annotated[float, Unit("s", ge=0)] = 0.0


class Comparator(Table):
    """The cell that the plan was drawn up with, a file or a table of its own; and what it is to be sized in.

    process: name of a shipped process description, or a file relative to the plan.
    """

    cell: str | None = None
    datasheet: Datasheet | None = None
    process: str | None = None
    topology: Topology | None = None


class Decoder(Table):
    """The thermometer decoder behind the array."""

    scheme: Scheme = "ones-counter"
    gate_energy: Annotated[float, Unit("J", ge=0)] | None = None


class Array(Table):
    """How much the simulation of the array draws."""

    arrays: Annotated[int, Field(ge=100, le=100_000_000, strict=True)] = 2000
    dynamic_arrays: Annotated[int, Field(ge=1, le=10_000, strict=True)] = 16
    samples: Annotated[int, Field(ge=256, le=2**26, strict=True)] = 65536
    seed: Annotated[int, Field(ge=0, strict=True)] = 1


class Plan(Table):
    """One plan file; `datasheet` is the cell that it names, or an empty one; `source` the file it came from."""

    converter: Converter
    goals: Goals
    allocation: Allocation = Allocation()
    ladder: Ladder = Ladder()
    clock: Clock = Clock()
    comparator: Comparator = Comparator()
    decoder: Decoder = Decoder()
    array: Array = Array()
    datasheet: Annotated[Datasheet, Field(exclude=True)] = Datasheet()
    source: Annotated[str, Field(exclude=True)] = "plan"

    @property
    def lsb(self) -> float:
        """One least significant bit, in V."""
        return self.converter.full_scale / 2**self.converter.bits

    @property
    def comparators(self) -> int:
        """Number of comparators and thresholds, 2**bits - 1."""
        return 2**self.converter.bits - 1
