"""The clock, supply and load that a plan asks a cell to work under."""

from dataclasses import dataclass

from flashplan.cell.process import Process
from flashplan.errors import InputError
from flashplan.plan.model import Plan

_COMMON_MODE = (
    0.65  # part of the supply: an n-channel pair needs its inputs in the upper half
)
_EDGE = 0.1  # rise time of the clock as a part of the decision time ...
_EDGES = (5e-12, 100e-12)  # ... and between these, s
_FAN_OUT = 4.0  # minimum gates that each output drives


@dataclass(frozen=True)
class Conditions:
    """Of one decision: supply and common_mode V; edge, decision_time, reset_time, period s; load F on each output."""

    process: Process
    supply: float
    common_mode: float
    edge: float
    decision_time: float
    reset_time: float
    period: float
    load: float


def conditions_for(plan: Plan, process: Process) -> Conditions:
    """Conditions of a plan's clock in a process.

    The decision takes decision_fraction of a period, the reset the rest; where the plan leaves less than a fifth of the
    period to the reset, that fifth is taken. Raises InputError for a supply that the process cannot bear.
    """
    supply = plan.converter.supply
    if supply > 1.35 * process.supply:
        raise InputError(
            f"{supply:g} V is too much for {process.name}, made for {process.supply:g} V",
            f"{plan.source}: converter.supply",
        )
    period = 1.0 / plan.converter.sample_rate
    decision = min(plan.converter.decision_fraction, 0.8) * period
    gate = (
        process.oxide_capacitance * process.minimum_width * process.minimum_length
        + (process.nmos.overlap_capacitance + process.pmos.overlap_capacitance)
        * process.minimum_width
    )
    return Conditions(
        process=process,
        supply=supply,
        common_mode=_COMMON_MODE * supply,
        edge=min(max(_EDGE * decision, _EDGES[0]), _EDGES[1]),
        decision_time=decision,
        reset_time=period - decision,
        period=period,
        load=_FAN_OUT * gate,
    )
