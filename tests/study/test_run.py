"""The same result whoever does the work, and however often it is broken off."""

import multiprocessing
import sqlite3
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from threadpoolctl import threadpool_info, threadpool_limits

from flashplan.errors import InputError
from flashplan.study.codec import encode_result
from flashplan.study.run import run_study
from tests.study.tasks import (
    Scaled,
    draw,
    interrupted_at_five,
    product,
    study_into,
    unhurried,
)

CHUNKS = 24


def _bytes(results: list[Any]) -> list[bytes]:
    return [encode_result(result) for result in results]


class BackwardsExecutor(Executor):
    """Runs what it is given last to first, once it is asked for the first result."""

    def __init__(self) -> None:
        self.order: list[int] = []
        self._calls: list[Any] = []

    def submit(self, function: Any, /, *arguments: Any, **options: Any) -> Future[Any]:
        future: Future[Any] = Future()
        self._calls.append((future, function, arguments))
        if len(self._calls) == CHUNKS:
            for future_, function_, arguments_ in reversed(self._calls):
                future_.set_result(function_(*arguments_))
                self.order.append(arguments_[2])
        return future


def test_threads_and_order_change_no_bit() -> None:
    alone = _bytes(run_study(draw, CHUNKS, seed=5))
    with ThreadPoolExecutor(3) as threads:
        assert _bytes(run_study(draw, CHUNKS, seed=5, executor=threads)) == alone
    backwards = BackwardsExecutor()
    assert _bytes(run_study(draw, CHUNKS, seed=5, executor=backwards)) == alone
    assert backwards.order == list(range(CHUNKS))[::-1]
    assert _bytes(run_study(draw, CHUNKS, seed=6)) != alone


def test_fewer_chunks_are_the_beginning_of_more() -> None:
    assert _bytes(run_study(draw, 7, seed=5)) == _bytes(run_study(draw, 9, seed=5))[:7]


def test_the_number_of_threads_of_the_linear_algebra_changes_no_bit() -> None:
    results = []
    for threads in (1, 4):
        with threadpool_limits(threads):
            results.append(_bytes(run_study(product, 2, seed=1)))
            found = {library["num_threads"] for library in threadpool_info()}
            assert found == {threads}  # handed back as it was
    assert results[0] == results[1]


def test_a_study_of_nothing_is_empty(tmp_path: Path) -> None:
    assert run_study(draw, 0, seed=1, store=tmp_path / "store") == []


def test_an_interrupt_keeps_what_was_finished(tmp_path: Path) -> None:
    store = tmp_path / "store"
    with pytest.raises(KeyboardInterrupt):
        run_study(interrupted_at_five, 9, seed=1, store=store)
    assert _kept(store) == {0, 1, 2, 3, 4}


def test_an_error_keeps_what_other_workers_finished(tmp_path: Path) -> None:
    class Finished(Executor):
        """Everything is done before the first result is looked at, as with fast workers."""

        def submit(self, function: Any, /, *arguments: Any) -> Future[Any]:
            future: Future[Any] = Future()
            try:
                future.set_result(function(*arguments))
            except KeyboardInterrupt as error:
                future.set_exception(error)
            return future

    store = tmp_path / "store"
    with pytest.raises(KeyboardInterrupt):
        run_study(interrupted_at_five, 9, seed=1, store=store, executor=Finished())
    assert _kept(store) == {0, 1, 2, 3, 4, 6, 7, 8}


def test_a_bad_input_found_in_a_worker_arrives() -> None:
    def refuse(index: int, generator: np.random.Generator) -> None:
        raise InputError("no good", "plan.toml")

    with (
        ThreadPoolExecutor(2) as threads,
        pytest.raises(InputError, match=r"plan\.toml: no good"),
    ):
        run_study(refuse, 9, seed=1, executor=threads)


def test_a_finished_study_is_read_and_not_computed(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    store = tmp_path / "store"
    first = _bytes(run_study(Scaled(2.0), 4, seed=1, store=store))

    def refuse(*arguments: object) -> None:
        raise AssertionError("computed again")

    monkeypatch.setattr(Scaled, "__call__", refuse)
    assert _bytes(run_study(Scaled(2.0), 4, seed=1, store=store)) == first


# Children of a server that has imported everything already start in milliseconds, so that kills fall into the work.
_FRESH = multiprocessing.get_context("forkserver")
_FRESH.set_forkserver_preload(["tests.study.tasks", "scipy.linalg"])


def test_killed_twenty_times_it_ends_as_if_left_alone(tmp_path: Path) -> None:
    store, chunks = tmp_path / "store", 300  # of at least 10 ms each, so that
    moments = np.random.default_rng(8).uniform(0.0, 0.13, size=20)  # it outlasts these
    kept = [0]
    for moment in moments:
        at_work = _FRESH.Event()
        process = _FRESH.Process(target=study_into, args=(store, chunks, at_work))
        process.start()
        assert at_work.wait(60)
        process.join(moment)
        process.kill()
        process.join()
        assert process.exitcode == -9  # it did not come to its end
        kept.append(len(_kept(store)))
    assert np.all(np.diff(kept) >= 0)
    assert 0 < kept[-1] < chunks
    resumed = run_study(unhurried, chunks, seed=3, store=store)
    alone = run_study(draw, chunks, seed=3)
    assert _bytes(resumed) == _bytes(alone)


def test_runs_at_once_on_one_store_agree(tmp_path: Path) -> None:
    store, chunks = tmp_path / "store", 30
    at_work = _FRESH.Event()
    processes = [
        _FRESH.Process(target=study_into, args=(store, chunks, at_work))
        for _ in range(4)
    ]
    for process in processes:
        process.start()
    for process in processes:
        process.join()
    assert [process.exitcode for process in processes] == [0, 0, 0, 0]
    database = sqlite3.connect(store)
    numbers = [row[0] for row in database.execute("SELECT number FROM chunk")]
    assert database.execute("PRAGMA integrity_check").fetchone() == ("ok",)
    database.close()
    assert sorted(numbers) == list(range(chunks))
    assert _bytes(run_study(unhurried, chunks, seed=3, store=store)) == _bytes(
        run_study(draw, chunks, seed=3)
    )


def _kept(store: Path) -> set[int]:
    database = sqlite3.connect(store)
    try:
        tables = database.execute("SELECT name FROM sqlite_master").fetchall()
        if ("chunk",) not in tables:
            return set()
        return {row[0] for row in database.execute("SELECT number FROM chunk")}
    finally:
        database.close()
