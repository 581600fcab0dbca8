"""A sweep: grid order, impossible points, and what survives when it is killed."""

import json
import os
import random
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from flashplan.errors import InputError
from flashplan.plan.axis import parse_axis
from flashplan.sweep import run_sweep
from tests.plans import starter_plan

QUICK = {"arrays": 100, "dynamic_arrays": 1, "samples": 1024}


def test_points_come_in_grid_order_with_what_was_reached() -> None:
    axes = [
        parse_axis("converter.bits=4,5"),
        parse_axis("comparator.datasheet.offset_sigma=1 mV:3 mV:2"),
    ]
    plan = starter_plan(array=QUICK, goals={"enob": 3.5})
    result = run_sweep(plan, axes)
    assert [tuple(point.vary.values()) for point in result.points] == [
        (4, 1e-3),
        (4, 3e-3),
        (5, 1e-3),
        (5, 3e-3),
    ]
    yields = [point.yield_ for point in result.points]
    assert yields[0] >= yields[1]  # type: ignore[operator]
    assert yields[2] > yields[3]  # type: ignore[operator]
    assert all(point.power for point in result.points)


def test_an_impossible_point_does_not_stop_the_sweep() -> None:
    plan = starter_plan(array=QUICK)
    result = run_sweep(plan, [parse_axis("goals.enob=5,5.99")])
    assert result.points[0].goals_met["enob"] is True
    assert "leave no room" in result.points[1].refused
    assert result.points[1].yield_ is None


def test_a_key_varied_twice_is_refused() -> None:
    with pytest.raises(InputError, match="varied twice"):
        run_sweep(
            starter_plan(), [parse_axis("goals.enob=4,5"), parse_axis("goals.enob=3,5")]
        )


def test_a_sweep_killed_twenty_times_ends_like_one_left_alone(tmp_path: Path) -> None:
    plan = tmp_path / "plan.toml"
    text = (Path(__file__).parents[1] / "flashplan/plan/starter.toml").read_text()
    for key, value in QUICK.items():
        text = "\n".join(
            f"{key} = {value}" if line.startswith(f"{key} =") else line
            for line in text.splitlines()
        )
    plan.write_text(text)

    def command(store: str) -> list[str]:
        vary = "comparator.datasheet.offset_sigma=0.5 mV:3 mV:16"
        return [
            sys.executable,
            "-m",
            "flashplan.cli",
            "sweep",
            str(plan),
            "--vary",
            vary,
            "--store",
            store,
            "--json",
        ]

    environment = {**os.environ, "OMP_NUM_THREADS": "1"}
    alone = subprocess.run(
        command(str(tmp_path / "alone")),
        capture_output=True,
        text=True,
        env=environment,
        check=True,
    )
    draw = random.Random(20)
    killed, store = 0, str(tmp_path / "killed")
    while killed < 20:
        process = subprocess.Popen(
            command(store),
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
            env=environment,
        )
        time.sleep(draw.uniform(0.5, 2.5))
        process.send_signal(signal.SIGKILL)
        killed += process.wait() == -signal.SIGKILL
        if (
            process.returncode == 0
        ):  # it came to its end: begin again, so that every kill meets work
            Path(store).unlink()
    last = subprocess.run(
        command(store), capture_output=True, text=True, env=environment, check=True
    )
    assert last.stdout == alone.stdout
    assert len(json.loads(last.stdout)["points"]) == 16
