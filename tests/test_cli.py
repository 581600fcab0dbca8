"""The command line as a person runs it: what each verb prints, writes and exits with."""

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from flashplan.plan.starter import starter_text

SMALL = (
    starter_text()
    .replace("arrays = 2000 ", "arrays = 200 ")
    .replace("dynamic_arrays = 16", "dynamic_arrays = 3")
    .replace("samples = 65536", "samples = 4096")
)


def run(
    *arguments: str | Path, folder: Path | None = None
) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "flashplan.cli", *map(str, arguments)],
        capture_output=True,
        text=True,
        cwd=folder,
        env={**os.environ, "COLUMNS": "80"},
        check=False,
    )


@pytest.fixture(scope="module")
def plan(tmp_path_factory: pytest.TempPathFactory) -> Path:
    file = tmp_path_factory.mktemp("plans") / "mine.toml"
    file.write_text(SMALL)
    return file


@pytest.fixture(scope="module")
def cell(plan: Path) -> Path:
    file = plan.parent / "cell.toml"
    file.write_text('[datasheet]\noffset_sigma = "0.5 mV"\ndelay = "200 ps"\n')
    return file


@pytest.mark.parametrize(
    ("verb", "keys"),
    [
        (("budget",), {"lsb", "comparators", "lines"}),
        (
            ("explain", "offset_sigma"),
            {"name", "limit", "unit", "formula", "source", "inputs", "sensitivities"},
        ),
        (("ladder",), {"taps", "errors_lsb", "mismatch_sigma_lsb"}),
        (("array",), {"static", "dynamic", "word_error_rate", "power", "goals_met"}),
        (("decoders",), {"schemes"}),
    ],
)
def test_a_verb_prints_a_table_or_one_json_document(
    plan: Path, verb: tuple[str, ...], keys: set[str]
) -> None:
    table = run(verb[0], plan, *verb[1:])
    assert table.returncode == 0, table.stderr
    assert max(map(len, table.stdout.splitlines())) <= 80
    document = run(
        verb[0], plan, *verb[1:], "--json", "--out", plan.parent / "out.json"
    )
    assert document.returncode == 0, document.stderr
    assert document.stderr == ""
    assert keys <= set(json.loads(document.stdout))
    assert (plan.parent / "out.json").read_text() == document.stdout


def test_check_judges_by_its_exit_status(plan: Path, cell: Path) -> None:
    verdict = run("check", plan, cell)
    assert verdict.returncode == 1
    assert "limits broken; worst is delay" in verdict.stdout
    document = json.loads(run("check", plan, cell, "--json").stdout)
    lines = {line["name"]: line for line in document["lines"]}
    assert document["met"] is False
    assert lines["offset_sigma"]["met"] is True
    assert lines["delay"]["margin"] == pytest.approx(-1 / 3)
    assert lines["noise_sigma"]["met"] is None


def test_array_exits_with_1_when_a_goal_is_missed(plan: Path) -> None:
    worse = plan.parent / "worse.toml"
    worse.write_text(
        SMALL.replace('regeneration_tau = "9 ps"', 'regeneration_tau = "20 ps"')
    )
    result = run("array", worse, "--json")
    assert result.returncode == 1
    assert json.loads(result.stdout)["goals_met"] == {
        "linearity": True,
        "enob": True,
        "word_error_rate": False,
    }


def test_two_workers_give_the_same_numbers_as_one(plan: Path) -> None:
    assert (
        run("array", plan, "--json", "--workers", "2").stdout
        == run("array", plan, "--json").stdout
    )


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("budget", "none.toml"), "none.toml: cannot read the file"),
        (("check", "PLAN", "none.toml"), "none.toml: cannot read the file"),
        (("explain", "PLAN", "ofset"), "no budget line 'ofset'"),
        (("new", "PLAN"), "is there already"),
        (
            ("budget", "PLAN", "--out", "no/such/folder.json"),
            "folder.json: cannot write the file",
        ),
        (
            ("sweep", "PLAN", "--vary", "converter.bitz=4:8:5"),
            "converter.bitz: unknown key",
        ),
        (("sweep", "PLAN", "--vary", "converter.name=a,b"), "is not a number"),
        (("measure", "none.csv", "--plan", "PLAN"), "none.csv: cannot read"),
        (("report", "PLAN", "--out", "PLAN"), "cannot make the folder"),
    ],
)
def test_bad_input_is_one_message_and_exit_2(
    plan: Path, arguments: tuple[str, ...], says: str
) -> None:
    result = run(
        *(str(plan) if part == "PLAN" else part for part in arguments),
        folder=plan.parent,
    )
    assert result.returncode == 2
    assert result.stdout == ""
    assert says in result.stderr
    assert "Traceback" not in result.stderr
    assert len(result.stderr.strip().splitlines()) == 1


@pytest.mark.parametrize(
    "arguments",
    [
        ("budget",),
        ("surprise",),
        ("budget", "a", "b"),
        ("array", "a", "--workers", "0"),
    ],
)
def test_wrong_usage_is_exit_2(arguments: tuple[str, ...]) -> None:
    result = run(*arguments)
    assert result.returncode == 2
    assert "Traceback" not in result.stderr


def test_a_misspelt_key_is_told_with_its_path_and_neighbour(plan: Path) -> None:
    file = plan.parent / "typo.toml"
    file.write_text(SMALL.replace("sample_rate", "sampel_rate"))
    result = run("budget", file)
    assert result.returncode == 2
    assert (
        f"{file}: converter.sampel_rate: unknown key; the nearest known one is 'sample_rate'"
        in result.stderr
    )


def test_a_reader_that_leaves_early_is_no_error(plan: Path) -> None:
    command = f"{sys.executable} -m flashplan.cli budget {plan} --json | head -c 10"
    result = subprocess.run(
        command, shell=True, capture_output=True, text=True, check=False
    )
    assert result.returncode == 0
    assert result.stderr == ""


def test_an_interrupt_says_so_and_leaves_no_half_written_file(
    plan: Path, tmp_path: Path
) -> None:
    long = tmp_path / "long.toml"
    long.write_text(SMALL.replace("arrays = 200 ", "arrays = 20000000 "))
    out = tmp_path / "out.json"
    process = subprocess.Popen(
        [sys.executable, "-m", "flashplan.cli", "array", str(long), "--out", str(out)],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    time.sleep(4)
    process.send_signal(signal.SIGINT)
    _, errors = process.communicate(timeout=30)
    assert process.returncode == 130
    assert "interrupted" in errors
    assert "Traceback" not in errors
    assert sorted(path.name for path in tmp_path.iterdir()) == ["long.toml"]


def test_a_sweep_goes_on_where_it_was(plan: Path, tmp_path: Path) -> None:
    arguments = (
        "sweep",
        plan,
        "--vary",
        "comparator.datasheet.offset_sigma=0.5mV:2mV:3",
        "--store",
        tmp_path / "kept",
    )
    first = run(
        *arguments,
        "--csv",
        tmp_path / "points.csv",
        "--figure",
        tmp_path / "points.svg",
        "--json",
    )
    assert first.returncode == 0, first.stderr
    points = json.loads(first.stdout)["points"]
    assert [point["vary"]["comparator.datasheet.offset_sigma"] for point in points] == [
        0.5e-3,
        1.25e-3,
        2e-3,
    ]
    assert points[0]["yield"] > points[1]["yield"] > points[2]["yield"]
    assert (tmp_path / "points.csv").read_text().count("\n") == 4
    assert "<svg" in (tmp_path / "points.svg").read_text()
    assert run(*arguments, "--json").stdout == first.stdout
    other = run(
        "sweep", plan, "--vary", "converter.bits=4,5", "--store", tmp_path / "kept"
    )
    assert other.returncode == 2
    assert "kept" in other.stderr


def test_help_loads_nothing_heavy() -> None:
    code = "import sys, flashplan.cli; print([m for m in ('numpy', 'scipy', 'pydantic', 'matplotlib') if m in sys.modules])"
    assert (
        subprocess.run(
            [sys.executable, "-c", code], capture_output=True, text=True, check=True
        ).stdout
        == "[]\n"
    )
