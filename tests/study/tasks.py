"""Small tasks for studies, importable by worker processes."""

import os
import signal
import time
from dataclasses import dataclass
from multiprocessing.synchronize import Event
from pathlib import Path
from typing import Any

import numpy as np

from flashplan.study.run import run_study
from flashplan.study.workers import study_executor


def draw(index: int, generator: np.random.Generator) -> dict[str, Any]:
    draws = generator.normal(size=50)
    return {"index": index, "draws": draws, "mean": float(draws.mean())}


def product(index: int, generator: np.random.Generator) -> dict[str, Any]:
    """Large enough for the linear algebra to share the sum among threads if it may."""
    matrix = generator.normal(size=(400, 400))
    return {"product": matrix @ matrix}


def unhurried(index: int, generator: np.random.Generator) -> dict[str, Any]:
    time.sleep(0.01)
    return draw(index, generator)


def half_hangs(index: int, generator: np.random.Generator) -> dict[str, Any]:
    if index % 2:
        time.sleep(600)
    return draw(index, generator)


def interrupted_at_five(index: int, generator: np.random.Generator) -> dict[str, Any]:
    if index == 5:
        raise KeyboardInterrupt
    return draw(index, generator)


def dies_at_three(index: int, generator: np.random.Generator) -> dict[str, Any]:
    if index == 3:
        os.kill(os.getpid(), signal.SIGKILL)
    return draw(index, generator)


@dataclass(frozen=True)
class Scaled:
    scale: float

    def __call__(self, index: int, generator: np.random.Generator) -> dict[str, Any]:
        return {"draw": self.scale * generator.normal()}


def study_into(store: str | Path, chunks: int, at_work: Event) -> None:
    """Run the unhurried task into a store, as a process of its own does, and tell when it begins."""
    at_work.set()
    run_study(unhurried, chunks, seed=3, store=store)


def hang_with_workers(store: str) -> None:
    """Start a study whose workers hang at every other chunk; its own process ends only when it is made to."""
    with study_executor(workers=2) as executor:
        run_study(half_hangs, 4, seed=3, store=store, executor=executor)
