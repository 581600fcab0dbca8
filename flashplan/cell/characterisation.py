"""A designer's own characterisation of a device (CSV) turned into the parameters of the device equation."""

import csv
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import least_squares

from flashplan.cell.charge import inversion_charge
from flashplan.cell.device import DeviceParameters, drain_current
from flashplan.cell.process import BOLTZMANN, ELECTRON, Process, process_from_table
from flashplan.errors import InputError

Floats = NDArray[np.float64]

COLUMNS = (
    "gate_voltage",
    "current",
    "gm",
    "gds",
    "gate_capacitance",
    "junction_capacitance",
)
_LEAST_POINTS = 8
_LARGEST_MISFIT = 0.2  # root-mean-square, relative


def process_from_characterisation(table: Mapping[str, Any], path: Path) -> Process:
    """A process whose devices come from measured tables: [characterisation] of a process file names one CSV by polarity.

    Keys nmos, pmos (CSV files beside this one), length (of the measured gates, m), drain_voltage (at which they were
    taken, V). Columns: gate_voltage V, then per gate width current A/m, gm S/m, gds S/m, gate_capacitance and
    junction_capacitance F/m, source at the bulk; p-channel values are given positive. Fits replace mobility_factor,
    threshold, slope_factor, saturation_velocity, early_field and junction_capacitance of the file's own tables.
    Raises InputError for a missing key, a table that is too short or not monotonic, or one the equation cannot follow.
    """
    where = f"{path}: characterisation"
    given = table["characterisation"]
    if not isinstance(given, Mapping):
        raise InputError("expected a table", where)
    for key in ("nmos", "pmos", "length", "drain_voltage"):
        if key not in given:
            raise InputError("missing key", f"{where}.{key}")
    for key in ("length", "drain_voltage"):
        if isinstance(given[key], bool) or not isinstance(given[key], (int, float)):
            raise InputError("expected a number", f"{where}.{key}")
    rest: dict[str, Any] = {k: v for k, v in table.items() if k != "characterisation"}
    base = process_from_table(rest, str(path))
    for kind in ("nmos", "pmos"):
        columns = read_characterisation(path.parent / str(given[kind]))
        fitted = fit_device(
            columns,
            float(given["length"]),
            float(given["drain_voltage"]),
            base.oxide_capacitance,
            base.temperature,
            str(path.parent / str(given[kind])),
        )
        rest[kind] = {**rest[kind], **fitted}
    return process_from_table(rest, str(path))


def read_characterisation(path: Path) -> dict[str, Floats]:
    """Columns of a characterisation CSV by name. Raises InputError that names the file and the column or row."""
    try:
        with path.open(encoding="utf-8", newline="") as file:
            rows = list(csv.DictReader(file))
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(f"cannot read the table: {error}", str(path)) from None
    found = list(rows[0]) if rows else []
    missing = [name for name in COLUMNS if name not in found]
    if missing:
        raise InputError(
            f"missing column {missing[0]!r}; a table has {', '.join(COLUMNS)}",
            str(path),
        )
    if len(rows) < _LEAST_POINTS:
        raise InputError(
            f"only {len(rows)} points; at least {_LEAST_POINTS} are needed", str(path)
        )
    columns = {name: np.empty(len(rows)) for name in COLUMNS}
    for number, row in enumerate(rows, start=2):
        for name in COLUMNS:
            try:
                columns[name][number - 2] = float(row[name])
            except (TypeError, ValueError):
                raise InputError(
                    f"not a number: {row[name]!r}", f"{path}: line {number}, {name}"
                ) from None
    for name in ("gate_voltage", "current"):
        falling = np.flatnonzero(np.diff(columns[name]) <= 0)
        if falling.size:
            raise InputError(
                f"{name} does not rise from line {falling[0] + 2} to the next",
                str(path),
            )
    if np.any(columns["current"] <= 0):
        raise InputError("currents must be positive", str(path))
    return columns


def fit_device(
    columns: Mapping[str, Floats],
    length: float,
    drain_voltage: float,
    oxide_capacitance: float,
    temperature: float,
    where: str,
) -> dict[str, float]:
    """Parameters of the device equation that follow measured currents, gm and gds best, in relative terms.

    Points in weak to strong inversion count alike (logarithms are compared). Raises InputError when the
    root-mean-square misfit exceeds 20 %, since numbers from such a fit would mislead.
    """
    u = BOLTZMANN * temperature / ELECTRON
    gate = columns["gate_voltage"]
    measured = np.log(
        np.concatenate(
            [columns["current"], columns["gm"], np.maximum(columns["gds"], 1e-30)]
        )
    )

    def equation(values: Floats) -> DeviceParameters:
        factor, threshold, slope, velocity, early = (
            np.exp(values[0]),
            values[1],
            values[2],
            np.exp(values[3]),
            np.exp(values[4]),
        )
        return DeviceParameters(
            threshold=np.array([threshold]),
            slope=np.array([slope]),
            specific_current=np.array([2 * slope * factor * u * u / length]),
            saturation=np.array(
                [2 * factor / oxide_capacitance * u / (velocity * length)]
            ),
            early_voltage=np.array([early * length]),
            thermal_voltage=np.array([u]),
            gate_charge=np.array([2 * slope * u * oxide_capacitance * length]),
        )

    def misfit(values: Floats) -> Floats:
        p, h = equation(values), 1e-3
        drain, source = np.array([drain_voltage]), np.zeros(1)
        current = drain_current(p, gate, drain, source)
        gm = drain_current(p, gate + h, drain, source)
        gm = (gm - drain_current(p, gate - h, drain, source)) / (2 * h)
        gds = drain_current(p, gate, drain + h, source)
        gds = (gds - drain_current(p, gate, drain - h, source)) / (2 * h)
        model = np.log(np.maximum(np.concatenate([current, gm, gds]), 1e-30))
        return model - measured

    # The threshold starts where gm is half its largest; the rest at values common to all processes.
    half = float(np.interp(0.5 * columns["gm"].max(), np.sort(columns["gm"]), gate))
    best = None
    for slope in (1.2, 1.5):
        found = least_squares(
            misfit,
            np.array([np.log(1e-4), half, slope, np.log(1e5), np.log(1e7)]),
            bounds=(
                [np.log(1e-7), 0.01, 1.0, np.log(2e3), np.log(1e4)],
                [np.log(0.05), 2.9, 2.9, np.log(9e6), np.log(1e10)],
            ),
            x_scale="jac",
        )
        best = found if best is None or found.cost < best.cost else best
    assert best is not None
    error = float(np.sqrt(np.mean(misfit(best.x) ** 2)))
    if error > _LARGEST_MISFIT:
        raise InputError(
            f"the device equation follows this table only to {error:.0%} (root mean square); at most 20 % is accepted",
            where,
        )
    return {
        "mobility_factor": float(np.exp(best.x[0])),
        "threshold": float(best.x[1]),
        "slope_factor": float(best.x[2]),
        "saturation_velocity": float(np.exp(best.x[3])),
        "early_field": float(np.exp(best.x[4])),
        "junction_capacitance": float(np.mean(columns["junction_capacitance"])),
        "overlap_capacitance": _overlap(columns, oxide_capacitance, length, best.x, u),
    }


def _overlap(
    columns: Mapping[str, Floats],
    oxide_capacitance: float,
    length: float,
    values: Floats,
    thermal_voltage: float,
) -> float:
    """Overlap on one side: half of what the strongest inverted gate has beyond two thirds of its oxide, F/m."""
    over = (columns["gate_voltage"][-1] - values[1]) / values[2] / thermal_voltage
    inverted = inversion_charge(np.array([over]))[0] > 1.0
    channel = (2.0 / 3.0) * oxide_capacitance * length if inverted else 0.0
    return max(0.0, (float(columns["gate_capacitance"][-1]) - channel) / 2.0)
