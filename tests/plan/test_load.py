"""Plan and cell files: what is read, and the one clear message for each way to get them wrong."""

from pathlib import Path
from typing import Any

import pytest

from flashplan.errors import InputError
from flashplan.plan import changed_plan, load_cell, load_plan, plan_from_table
from flashplan.plan.load import read_toml
from flashplan.plan.starter import starter_text, write_starter


@pytest.fixture
def table(tmp_path: Path) -> dict[str, Any]:
    file = tmp_path / "starter.toml"
    write_starter(file)
    return read_toml(file)


def refused(table: dict[str, Any], path: str, value: Any) -> str:
    """The message for a plan with one key changed, or removed where the value is None."""
    *parents, key = path.split(".")
    place = table
    for parent in parents:
        place = place.setdefault(parent, {})
    if value is None:
        del place[key]
    else:
        place[key] = value
    with pytest.raises(InputError) as caught:
        plan_from_table(table, "some.toml")
    return str(caught.value)


def test_the_starter_plan_is_a_valid_plan(tmp_path: Path) -> None:
    file = tmp_path / "starter.toml"
    write_starter(file)
    plan = load_plan(file)
    assert plan.lsb == pytest.approx(0.8 / 64)
    assert plan.comparators == 63
    assert plan.datasheet.offset_sigma == pytest.approx(1.1e-3)


def test_a_starter_plan_never_overwrites(tmp_path: Path) -> None:
    file = tmp_path / "mine.toml"
    file.write_text("precious")
    with pytest.raises(InputError, match=r"mine\.toml"):
        write_starter(file)
    assert file.read_text() == "precious"


@pytest.mark.parametrize(
    ("path", "value", "says"),
    [
        (
            "converter.bitz",
            6,
            "converter.bitz: unknown key; the nearest known one is 'bits'",
        ),
        ("converter.bits", None, "converter.bits: missing key"),
        ("converter.bits", 6.5, "converter.bits: must be a valid integer; found 6.5"),
        ("converter.bits", 20, "less than or equal to 12; found 20"),
        ("converter.bits", True, "converter.bits: must be a valid integer"),
        ("converter.sample_rate", "2 V", "expected a number or a quantity in Hz"),
        ("converter.sample_rate", float("nan"), "finite"),
        ("converter.sample_rate", float("inf"), "finite"),
        ("converter.sample_rate", "0 Hz", "greater than 0"),
        ("converter.supply", [1], "expected a number or a quantity in V"),
        (
            "converter.architecture",
            "folding",
            "'flash' or 'subranging'; found 'folding'",
        ),
        ("converter", 5, "converter: expected a table, found 5"),
        ("goals.enob", 6.5, "goals.enob: 6.5 effective bits cannot come from 6 bits"),
        ("goals.yield", 1, "goals.yield: must be less than 1"),
        ("goals.dnl_lsb", 0, "goals.dnl_lsb: must be greater than 0"),
        ("goals.linearity_fit", "line", "'none', 'endpoint' or 'best'; found 'line'"),
        ("allocation.offset", 0.9, "sum to 1.5; at most 1"),
        ("allocation.systematic_lsb", 0.5, "leaves nothing"),
        ("ladder.total_resistance", "automatic", "must be 'auto' or"),
        ("ladder.forced_taps", [64], "tap 64 is beyond the last one"),
        (
            "comparator.datasheet.offst_sigma",
            "1 mV",
            "the nearest known one is 'offset_sigma'",
        ),
        ("comparator.datasheet.noise_sigma", "-1 mV", "greater than or equal to 0"),
        ("comparator.cell", "none.toml", "comparator: give a cell file or a table"),
        ("decoder.scheme", "grey-rom", "decoder.scheme: must be 'rom'"),
        ("surprise", 1, "surprise: unknown key"),
        ("source", "x", "source: unknown key"),
    ],
)
def test_a_wrong_plan_is_refused_with_its_key_path(
    table: dict[str, Any], path: str, value: Any, says: str
) -> None:
    message = refused(table, path, value)
    assert message.startswith("some.toml: ")
    assert says in message


def test_a_cell_file_that_is_not_there_is_named(table: dict[str, Any]) -> None:
    del table["comparator"]
    message = refused(table, "comparator.cell", "cells/none.toml")
    assert "comparator.cell: there is no cell file cells/none.toml" in message


def test_files_that_cannot_be_read_are_named(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"none\.toml: cannot read the file"):
        load_plan(tmp_path / "none.toml")
    bad = tmp_path / "bad.toml"
    bad.write_text("[converter\n")
    with pytest.raises(InputError, match=r"bad\.toml: not a TOML file"):
        load_plan(bad)
    bad.write_bytes(b"\xff\xfe")
    with pytest.raises(InputError, match=r"bad\.toml: not a TOML file"):
        load_plan(bad)


def test_a_cell_file_is_read_and_its_notes_are_passed_over(tmp_path: Path) -> None:
    file = tmp_path / "cell.toml"
    file.write_text(
        '[datasheet]\noffset_sigma = "1 mV"\narea = "25 um2"\n[devices]\nm1 = "anything"\n'
    )
    cell = load_cell(file)
    assert cell.offset_sigma == pytest.approx(1e-3)
    assert cell.area == pytest.approx(25e-12)
    assert cell.noise_sigma is None


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "missing table"),
        ("[datashet]\n", "datashet: unknown table"),
        (
            '[datasheet]\ndelay = "3 V"\n',
            "datasheet.delay: expected a number or a quantity in s",
        ),
    ],
)
def test_a_wrong_cell_is_refused(tmp_path: Path, text: str, says: str) -> None:
    file = tmp_path / "cell.toml"
    file.write_text(text)
    with pytest.raises(InputError) as caught:
        load_cell(file)
    assert str(file) in str(caught.value)
    assert says in str(caught.value)


def test_a_changed_plan_keeps_everything_else(tmp_path: Path) -> None:
    file = tmp_path / "starter.toml"
    file.write_text(starter_text())
    plan = load_plan(file)
    more_bits = changed_plan(plan, {"converter.bits": 7})
    assert more_bits.comparators == 127
    assert more_bits.datasheet == plan.datasheet
    other_cell = changed_plan(plan, {"comparator.datasheet.offset_sigma": "2 mV"})
    assert other_cell.datasheet.offset_sigma == pytest.approx(2e-3)
    assert other_cell.datasheet.noise_sigma == plan.datasheet.noise_sigma
    with pytest.raises(InputError, match="converter"):
        changed_plan(plan, {"converter.bitz": 7})
