"""A comparator cell's datasheet: one number per key, each optional, none assumed zero."""

from typing import Annotated

from flashplan.plan.fields import Table, Unit


class Datasheet(Table):
    """What is known of one comparator, in SI; None for what is not known.

    hysteresis is the full width between the two trip points; regeneration_gain the gain from input to the latch's
    start; skew_sigma one comparator's sampling instant against the array's mean; kickback_charge the differential
    charge pushed into its tap at a decision; coupling_capacitance from the signal input to the tap; energy per decision.
    """

    offset_sigma: Annotated[float, Unit("V", ge=0)] | None = None
    noise_sigma: Annotated[float, Unit("V", ge=0)] | None = None
    hysteresis: Annotated[float, Unit("V", ge=0)] | None = None
    regeneration_tau: Annotated[float, Unit("s", gt=0)] | None = None
    regeneration_gain: Annotated[float, Unit("ratio", gt=0)] | None = None
    delay: Annotated[float, Unit("s", ge=0)] | None = None
    skew_sigma: Annotated[float, Unit("s", ge=0)] | None = None
    kickback_charge: Annotated[float, Unit("C", ge=0)] | None = None
    input_capacitance: Annotated[float, Unit("F", ge=0)] | None = None
    coupling_capacitance: Annotated[float, Unit("F", ge=0)] | None = None
    energy: Annotated[float, Unit("J", ge=0)] | None = None
    static_power: Annotated[float, Unit("W", ge=0)] | None = None
    area: Annotated[float, Unit("m2", ge=0)] | None = None
