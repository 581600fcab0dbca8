"""One worker against two, on the same study, and against what two bare processes get from this machine.

The figures in brackets are the ratios. Two workers can be no faster than the bare processes, which are no faster than
one where the second core is busy with other things.
"""

from concurrent.futures import ProcessPoolExecutor
from functools import partial
from multiprocessing import get_context
from typing import Any

import numpy as np
import pytest

from flashplan.study.run import run_study
from flashplan.study.seeds import chunk_generator
from flashplan.study.workers import study_executor

CHUNKS = 16

pytestmark = pytest.mark.benchmark(group="33 million draws")


def static_chunk(index: int, generator: np.random.Generator) -> dict[str, Any]:
    """About as much work as a chunk of drawn arrays: 2 million normals and their largest steps."""
    draws = generator.normal(size=(8192, 255))
    return {"worst": np.abs(np.diff(draws, axis=1)).max(axis=1)}


def bare_chunk(index: int) -> dict[str, Any]:
    return static_chunk(index, chunk_generator(1, index))


@pytest.mark.parametrize("workers", [1, 2])
def test_a_study(benchmark: Any, workers: int) -> None:
    with study_executor(workers) as executor:
        study = partial(run_study, static_chunk, seed=1, executor=executor)
        study(2 * workers)  # starts the workers
        results = benchmark.pedantic(study, (CHUNKS,), rounds=5)
    assert len(results) == CHUNKS


def test_two_bare_processes(benchmark: Any) -> None:
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool:
        list(pool.map(bare_chunk, range(4)))
        results = benchmark.pedantic(
            lambda: list(pool.map(bare_chunk, range(CHUNKS))), rounds=5
        )
    assert len(results) == CHUNKS
