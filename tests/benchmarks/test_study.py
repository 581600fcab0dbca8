"""One worker against two, on the same study; the table's bracketed figures are the ratios."""

from typing import Any

import numpy as np
import pytest

from flashplan.study.run import run_study
from flashplan.study.workers import study_executor

CHUNKS = 16


def static_chunk(index: int, generator: np.random.Generator) -> dict[str, Any]:
    """About as much work as a chunk of drawn arrays: 2 million normals and their running extremes."""
    draws = generator.normal(size=(8192, 255))
    return {"worst": np.abs(np.diff(draws, axis=1)).max(axis=1)}


@pytest.mark.benchmark(group="a study of 33 million draws, by workers")
@pytest.mark.parametrize("workers", [1, 2])
def test_two_workers_take_about_half_the_time(benchmark: Any, workers: int) -> None:
    with study_executor(workers) as executor:
        run_study(static_chunk, 2 * workers, seed=1, executor=executor)  # starts them
        results = benchmark.pedantic(
            run_study,
            (static_chunk, CHUNKS),
            {"seed": 1, "executor": executor},
            rounds=5,
        )
    assert len(results) == CHUNKS
