"""Sizing a comparator against a budget: least energy, then area, inside every limit, confirmed by the transient bench."""

import math
from collections.abc import Mapping
from pathlib import Path
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from flashplan.cell.bench.setup import Setup
from flashplan.cell.process import (
    Process,
    choose_process,
    generic_names,
    load_process,
)
from flashplan.cell.sized import Relaxation, SizedCell, SizedDevice
from flashplan.cell.sizing.clocked import (
    CLOCKED,
    Topology,
    bounds,
    first_guess,
    require_supply,
    setup_of,
)
from flashplan.cell.sizing.conditions import Conditions, conditions_for
from flashplan.cell.sizing.confirm import Measured, measure_quick, measure_whole
from flashplan.cell.sizing.model import RESETS, ModelValues, evaluate, tau_at_gain
from flashplan.cell.sizing.optimise import Optimum, optimise
from flashplan.errors import InputError
from flashplan.plan.datasheet import Datasheet
from flashplan.plan.model import Plan

Floats = NDArray[np.float64]

_MARGIN = 0.93  # part of a limit aimed at: what the search's tolerance and the bench's scatter may take back
_SEARCH = ((18, 2.5), (8, 0.7))  # evaluations and reach: first round, later ones
_ROUNDS = 3  # of correcting the model by the bench, at most
_AGREED = (
    0.03  # relative change of a correction below which the model needs no further round
)
_IMPOSSIBLE = (
    0.05  # excess left by a search beyond which correcting the model will not help
)
_BINDING = 0.05  # of a limit's logarithm, within which it counts as reached
_FAR = 8.0  # largest logarithm of value over limit that the search is shown
_DRAWS = 200  # mismatch draws that confirm the offset
_TOLERANCE = 1e-6
_AREA_WEIGHT = 0.02  # against ln(energy): area decides only between equals

# The plan's key that gives a limit more room, by line.
_GOALS = {
    "offset_sigma": "goals.dnl_lsb, goals.inl_lsb, goals.yield or converter.full_scale",
    "noise_sigma": "goals.enob or allocation.noise",
    "hysteresis": "goals.enob or allocation.hysteresis",
    "skew_sigma": "goals.enob, allocation.skew or converter.input_frequency",
    "regeneration_tau": "converter.latch_stages, goals.word_error_rate or converter.decision_fraction",
    "delay": "allocation.delay_fraction or converter.decision_fraction",
    "kickback_charge": "ladder.total_resistance, ladder.tap_capacitance or allocation.systematic_lsb",
    "input_capacitance": "converter.source_resistance or allocation.input_droop_db",
}
_SIZED_LINES = tuple(_GOALS)


class Progress(Protocol):
    """What is told of the way: `total` steps, some of them found done, each one reported."""

    def begin(self, total: int, finished: int) -> None:
        """The work starts."""

    def advance(self) -> None:
        """One more step is done."""

    def end(self) -> None:
        """The work is over."""


def size_cell(
    plan: Plan,
    limits: Any,
    topology: str | None = None,
    process: Process | str | None = None,
    progress: Progress | None = None,
    draws: int = _DRAWS,
) -> SizedCell:
    """Size a clocked comparator for a plan and measure what came out.

    limits: a budget (anything whose `lines` maps names to lines with a `limit`) or a mapping of names to limits in SI;
    None is no limit. topology, process: None takes the plan's own [comparator] keys, or else double-tail and the shipped
    process whose supply is nearest to the plan's; a process may be a description, or the name or file of one. draws: mismatch draws that confirm the offset.

    The linearised model is minimised for energy, then area, inside 93 % of every limit; the bench measures that cell
    and corrects the model by the ratio, at most three times. Seeds follow from the plan's, so that a run repeats.
    Raises InputError for a topology or process that is not known or cannot work at the plan's supply.
    """
    name = topology or plan.comparator.topology or "double-tail"
    if name not in CLOCKED:
        raise InputError(
            f"topology {name!r} cannot be sized; those that can are {', '.join(CLOCKED)}",
            f"{plan.source}: comparator.topology",
        )
    kind = CLOCKED[name]
    chosen = _process(plan, process)
    conditions = conditions_for(plan, chosen)
    require_supply(kind, conditions)
    allowed = _limits(limits)
    if progress is not None:
        progress.begin(_ROUNDS + 1, 0)
    try:
        return _sized(plan, kind, conditions, allowed, progress, draws)
    finally:
        if progress is not None:
            progress.end()


def _process(plan: Plan, given: Process | str | None) -> Process:
    if isinstance(given, Process):
        return given
    if given is not None:
        return load_process(given)
    own = plan.comparator.process
    if own is None:
        return choose_process(plan.converter.supply)
    return load_process(
        own if own in generic_names() else Path(plan.source).parent / own
    )


def _limits(limits: Any) -> dict[str, float]:
    lines = getattr(limits, "lines", None)
    given: Mapping[str, Any] = (
        limits if lines is None else {name: line.limit for name, line in lines.items()}
    )
    return {
        name: float(given[name])
        for name in _SIZED_LINES
        if given.get(name) is not None and math.isfinite(given[name])
    }


def _sized(
    plan: Plan,
    kind: Topology,
    conditions: Conditions,
    allowed: dict[str, float],
    progress: Progress | None,
    draws: int,
) -> SizedCell:
    seed = plan.array.seed
    x = first_guess(kind, conditions)
    correction: dict[str, float] = {}
    search = _Search(plan, kind, conditions, allowed)
    for number in range(_ROUNDS):
        optimum = search.run(
            x,
            correction,
            evaluations=_SEARCH[number > 0][0],
            reach=_SEARCH[number > 0][1],
        )
        x = optimum.x
        values = evaluate(kind, conditions, [x])
        setup = setup_of(kind, conditions, x)
        quick = _measure(setup, kind, conditions)
        _step(progress)
        new = _corrections(quick, values, correction, allowed)
        change = max(
            (abs(math.log(new[k] / correction.get(k, 1.0))) for k in new), default=0.0
        )
        correction = new
        fast = {name: allowed[name] for name in allowed if name in quick.values}
        if change < _AGREED or (
            number > 0
            and (
                optimum.excess.max() > _IMPOSSIBLE
                or not _broken(plan, fast, quick.values)
            )
        ):
            break
    tail = "pair" if kind.static else "tail"
    whole = measure_whole(setup, quick, values.linear, tail, draws, seed)
    _step(progress)
    known = {k: v for k, v in whole.values.items() if math.isfinite(v)}
    broken = _broken(plan, allowed, known)
    return SizedCell(
        topology=kind.name,
        process=conditions.process.name,
        met=not broken,
        datasheet=Datasheet(**known),
        origins=whole.origins,
        devices=_devices(kind, conditions, optimum, search.names, values, whole),
        parameters={"resistance": math.exp(x[-1])} if kind.static else {},
        relaxations=tuple(
            Relaxation(name, _GOALS[name], allowed[name], value)
            for name, value in broken.items()
        ),
        failed_instances=whole.failed,
        notes=(
            f"inputs rest at {conditions.common_mode:.3g} V, where the ladder's taps are taken to lie",
            f"clock edge {conditions.edge * 1e12:.3g} ps, load {conditions.load * 1e15:.3g} fF on each output",
            "skew is the cell's own; the clock tree adds its own",
        ),
    )


class _Search:
    """The optimiser's view of one sizing task: names of the limits and the model in logarithms over them."""

    def __init__(
        self,
        plan: Plan,
        kind: Topology,
        conditions: Conditions,
        allowed: dict[str, float],
    ) -> None:
        self.plan, self.kind, self.conditions = plan, kind, conditions
        self.allowed = allowed
        own = ["reset", *(["headroom"] if kind.static else [])]
        self.names = [
            name for name in allowed if name != "hysteresis" and allowed[name] > 0
        ] + own

    def run(
        self,
        x: Floats,
        correction: dict[str, float],
        evaluations: int,
        reach: float,
    ) -> Optimum:
        """Best sizes from x on, with the model's values times their corrections."""

        def model(points: list[Floats]) -> tuple[Floats, Floats]:
            values = evaluate(self.kind, self.conditions, points)
            objective = np.log(values.energy) + _AREA_WEIGHT * np.log(values.area)
            return objective, self._excess(values, correction)

        return optimise(
            model, x, bounds(self.kind, self.conditions), evaluations, reach
        )

    def _excess(self, values: ModelValues, correction: dict[str, float]) -> Floats:
        rows = []
        for name in self.names:
            value = values.limited[name] * correction.get(name, 1.0)
            limit = self.allowed.get(name, 1.0)
            if name == "regeneration_tau":
                gain = values.gain * correction.get("regeneration_gain", 1.0)
                value = _tau_as_judged(self.plan, value, gain)
            margin = _MARGIN if name in self.allowed else 1.0
            with np.errstate(divide="ignore", invalid="ignore"):
                rows.append(np.log(value / (margin * limit)))
        # Sizes that make no comparator at all have no finite values; they count as far outside every limit.
        excess: Floats = np.nan_to_num(
            np.array(rows), nan=_FAR, posinf=_FAR, neginf=-_FAR
        )
        return np.clip(excess, -_FAR, _FAR)


def _tau_as_judged(plan: Plan, tau: Floats, gain: Floats) -> Floats:
    """tau as the budget would see it, whose limit was derived with the plan's own gain or 1."""
    assumed = plan.datasheet.regeneration_gain or 1.0
    return tau_at_gain(
        tau,
        gain,
        assumed,
        plan.converter.supply / 2.0,
        plan.lsb,
        plan.goals.word_error_rate,
    )


def _measure(setup: Setup, kind: Topology, conditions: Conditions) -> Measured:
    try:
        return measure_quick(setup)
    except ValueError as error:
        raise InputError(
            f"{kind.name} in {conditions.process.name} does not decide under this clock: {error}",
            "converter.sample_rate",
        ) from None


def _corrections(
    quick: Measured,
    values: ModelValues,
    before: dict[str, float],
    allowed: dict[str, float],
) -> dict[str, float]:
    """Measured over modelled, by name; offset and noise need none, their linear analysis being exact to first order."""
    found = dict(before)
    for name in ("regeneration_tau", "delay", "skew_sigma", "kickback_charge"):
        found[name] = quick.values[name] / float(values.limited[name][0])
    found["regeneration_gain"] = quick.values["regeneration_gain"] / float(
        values.gain[0]
    )
    limit = allowed.get("hysteresis", math.inf)
    if quick.values["hysteresis"] > limit > 0:
        # What is remembered falls by e per time constant: so many more are needed, and one to spare.
        more = math.log(quick.values["hysteresis"] / limit) + 1.0
        found["reset"] = found.get("reset", 1.0) * (1.0 + more / RESETS)
    return {name: value for name, value in found.items() if value > 0}


def _broken(
    plan: Plan, allowed: dict[str, float], values: dict[str, float]
) -> dict[str, float]:
    """Limits that the measured cell does not meet, with what it has; tau as the budget judges it at the cell's gain."""
    found = {}
    for name, limit in allowed.items():
        value = values.get(name, math.inf)
        if name == "regeneration_tau":
            value = float(
                _tau_as_judged(
                    plan, np.array(value), np.array(values["regeneration_gain"])
                )
            )
        if value > limit * (1 + _TOLERANCE):
            found[name] = value
    return found


def _devices(
    kind: Topology,
    conditions: Conditions,
    optimum: Optimum,
    names: list[str],
    values: ModelValues,
    whole: Measured,
) -> tuple[SizedDevice, ...]:
    parts = setup_of(kind, conditions, optimum.x).network.circuit.devices
    linear = values.linear
    found = []
    for k, group in enumerate(kind.groups):
        rows = [i for i, d in enumerate(parts) if _group(d.name, kind) == group]
        found.append(
            SizedDevice(
                name=group,
                count=len(rows),
                width=parts[rows[0]].width,
                length=parts[rows[0]].length,
                binds=_binds(k, optimum, names, kind, conditions),
                offset_sigma=float(np.hypot.reduce(linear.offset_by_device[rows, 0])),
                noise_sigma=float(np.hypot.reduce(linear.noise_by_device[rows, 0])),
                energy=float(whole.cycle.device_energy[rows].sum()),
            )
        )
    return tuple(found)


def _group(device: str, kind: Topology) -> str:
    """A device's group: the longest group name that its own name begins with."""
    return max((g for g in kind.groups if device.startswith(g)), key=len)


def _binds(
    k: int,
    optimum: Optimum,
    names: list[str],
    kind: Topology,
    conditions: Conditions,
) -> str:
    """The reached limit that a narrower device would break most; else the least width, else energy alone."""
    low = bounds(kind, conditions)[k][0]
    if optimum.x[k] < low + 1e-3:
        return "minimum width"
    reached = [
        i
        for i in range(len(names))
        if optimum.excess[i] > optimum.excess.max() - _BINDING
        and optimum.excess[i] > -_BINDING
    ]
    strongest = min(reached, key=lambda i: optimum.slopes[i, k], default=None)
    if strongest is None or optimum.slopes[strongest, k] > -1e-2:
        return "energy"
    return names[strongest]


def _step(progress: Progress | None) -> None:
    if progress is not None:
        progress.advance()
