"""Process descriptions and characterisation tables: what is read, and what is refused with a clear message."""

import csv

import numpy as np
import pytest

from flashplan.cell.circuit import device_parameters
from flashplan.cell.device import drain_current, small_signal
from flashplan.cell.process import (
    at_temperature,
    generic_names,
    load_process,
    process_from_table,
)
from flashplan.errors import InputError


def table(**changes):
    found = load_process("generic-65nm").model_dump()
    for path, value in changes.items():
        *parents, key = path.split("__")
        place = found
        for parent in parents:
            place = place[parent]
        if value is None:
            del place[key]
        else:
            place[key] = value
    return found


def test_five_generic_descriptions_are_shipped_and_say_that_they_are_generic():
    assert generic_names() == [
        "generic-180nm",
        "generic-1um",
        "generic-28nm",
        "generic-2um",
        "generic-65nm",
    ]
    for name in generic_names():
        process = load_process(name)
        assert process.name == name
        assert "no foundry" in process.note


@pytest.mark.parametrize(
    ("changes", "path", "message"),
    [
        ({"nmos__threshold": None}, "nmos.threshold", "missing key"),
        ({"nmos__threshold": -0.3}, "nmos.threshold", "greater than 0"),
        (
            {"pmos__slope_factor": 0.5},
            "pmos.slope_factor",
            "greater than or equal to 1",
        ),
        ({"oxide_capacitance": 5.0}, "oxide_capacitance", "less than"),
        ({"supply": "fast"}, "supply", "expected a number"),
        ({"doping": 1e17}, "doping", "unknown key"),
    ],
)
def test_a_wrong_description_names_the_key(changes, path, message):
    with pytest.raises(InputError) as caught:
        process_from_table(table(**changes), "mine.toml")
    assert caught.value.where == f"mine.toml: {path}"
    assert message in caught.value.message


def test_an_unknown_process_lists_those_that_are_shipped():
    with pytest.raises(InputError, match="generic-28nm"):
        load_process("generic-7nm")


def test_a_file_that_is_not_toml_is_refused(tmp_path):
    file = tmp_path / "p.toml"
    file.write_text("name = ")
    with pytest.raises(InputError, match="not a TOML file"):
        load_process(file)


def test_a_temperature_out_of_range_is_refused():
    with pytest.raises(InputError, match="150 and 500 K"):
        at_temperature(load_process("generic-65nm"), 20.0)


def characterise(path, kind, process, points=30, spoil=None):
    """Write the table that a perfect device of a process would give."""
    width, length, drain = 1.0, 65e-9, 0.6
    polarity = getattr(process, kind)
    p = device_parameters(process, [polarity], np.array([width]), np.array([length]))
    gate = np.linspace(0.15, process.supply, points)
    point = small_signal(p, gate, np.array([drain]), np.zeros(1))
    gate_capacitance = (
        2 / 3 * process.oxide_capacitance * length + 2 * polarity.overlap_capacitance
    )
    rows = np.column_stack(
        [
            gate,
            point.current,
            point.transconductance,
            point.output_conductance,
            np.full(points, gate_capacitance),
            np.full(points, polarity.junction_capacitance),
        ]
    )
    if spoil:
        spoil(rows)
    with path.open("w", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(
            [
                "gate_voltage",
                "current",
                "gm",
                "gds",
                "gate_capacitance",
                "junction_capacitance",
            ]
        )
        writer.writerows(rows.tolist())


def description(folder, process):
    tables = ["[characterisation]", 'nmos = "n.csv"', 'pmos = "p.csv"']
    tables += ["length = 65e-9", "drain_voltage = 0.6"]
    top = []
    for key, value in process.model_dump().items():
        if isinstance(value, dict):
            # start from the wrong device: the fit has to find the right one
            value = {**value, "threshold": 0.6, "mobility_factor": 1e-4}
            tables += [f"[{key}]", *(f"{k} = {v}" for k, v in value.items())]
        elif isinstance(value, str):
            top.append(f'{key} = "{value}"')
        else:
            top.append(f"{key} = {value}")
    file = folder / "own.toml"
    file.write_text("\n".join(top + tables))
    return file


def test_a_characterisation_table_gives_back_the_device(tmp_path):
    process = load_process("generic-65nm")
    for kind, name in (("nmos", "n.csv"), ("pmos", "p.csv")):
        characterise(tmp_path / name, kind, process)
    own = load_process(description(tmp_path, process))
    gate = np.linspace(0.2, 1.2, 15)
    for kind in ("nmos", "pmos"):
        currents = [
            drain_current(
                device_parameters(
                    p, [getattr(p, kind)], np.array([1e-6]), np.array([65e-9])
                ),
                gate,
                np.array([0.9]),
                np.zeros(1),
            )
            for p in (process, own)
        ]
        # at another drain voltage than the table's; currents span four decades
        assert currents[1] == pytest.approx(currents[0], rel=0.03)
        assert getattr(own, kind).overlap_capacitance == pytest.approx(
            getattr(process, kind).overlap_capacitance, rel=0.01
        )


def fall(rows):
    rows[10, 1] = rows[9, 1]


def jagged(rows):
    rows[:, 2] *= np.where(np.arange(rows.shape[0]) % 2, 3.0, 0.3)


@pytest.mark.parametrize(
    ("points", "spoil", "message"),
    [
        (5, None, "only 5 points"),
        (30, fall, "current does not rise from line 11"),
        (30, jagged, "follows this table only to"),
    ],
)
def test_a_bad_table_is_refused(tmp_path, points, spoil, message):
    process = load_process("generic-65nm")
    characterise(tmp_path / "n.csv", "nmos", process, points, spoil)
    characterise(tmp_path / "p.csv", "pmos", process)
    with pytest.raises(InputError, match=message) as caught:
        load_process(description(tmp_path, process))
    assert "n.csv" in caught.value.where
