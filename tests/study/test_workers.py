"""Local processes and a cluster do the work of this process, and end with it."""

import contextlib
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from distributed import LocalCluster

from flashplan.errors import InputError
from flashplan.study import workers as workers_module
from flashplan.study.codec import encode_result
from flashplan.study.fingerprint import study_fingerprint
from flashplan.study.run import run_study
from flashplan.study.store import Store
from flashplan.study.workers import study_executor
from tests.study.tasks import dies_at_three, draw, half_hangs, product

CHUNKS = 12


def _bytes(results: list) -> list[bytes]:
    return [encode_result(result) for result in results]


@pytest.mark.parametrize("workers", [None, 1])
def test_one_worker_is_this_process(workers: int | None) -> None:
    with study_executor(workers) as executor:
        assert executor is None


def test_two_processes_change_no_bit() -> None:
    with study_executor(2) as executor:
        shared = run_study(draw, CHUNKS, seed=5, executor=executor)
        products = run_study(product, 2, seed=5, executor=executor)
    assert _bytes(shared) == _bytes(run_study(draw, CHUNKS, seed=5))
    assert _bytes(products) == _bytes(run_study(product, 2, seed=5))


def test_a_cluster_changes_no_bit(tmp_path: Path) -> None:
    store = tmp_path / "store"
    with (
        LocalCluster(
            n_workers=2, threads_per_worker=1, dashboard_address=None
        ) as cluster,
        study_executor(cluster=cluster.scheduler_address) as executor,
    ):
        shared = run_study(draw, CHUNKS, seed=5, store=store, executor=executor)
        products = run_study(product, 2, seed=5, executor=executor)
    assert _bytes(shared) == _bytes(run_study(draw, CHUNKS, seed=5))
    assert _bytes(products) == _bytes(run_study(product, 2, seed=5))
    assert _bytes(run_study(draw, CHUNKS, seed=5, store=store)) == _bytes(shared)


def test_a_worker_that_dies_is_told() -> None:
    with (
        pytest.raises(InputError, match="a worker process died"),
        study_executor(2) as executor,
    ):
        run_study(dies_at_three, 8, seed=1, executor=executor)


def _start_hanging(store: Path) -> tuple[subprocess.Popen[str], list[int]]:
    """A process whose two workers hang, once the two chunks that do not hang are kept, and the workers' ids."""
    program = (
        f"from tests.study.tasks import hang_with_workers as go; go({str(store)!r})"
    )
    process = subprocess.Popen(
        [sys.executable, "-c", program], stderr=subprocess.PIPE, text=True
    )
    patience = time.monotonic() + 60
    while time.monotonic() < patience and process.poll() is None:
        if store.exists() and _kept(store) == {0, 2}:
            break
        time.sleep(0.05)
    children = Path(f"/proc/{process.pid}/task/{process.pid}/children").read_text()
    return process, [int(child) for child in children.split()]


def _kept(store: Path) -> set[int]:
    with Store(store, study_fingerprint(half_hangs, 4, 3)) as opened:
        return set(opened.finished())


def _all_gone(children: list[int]) -> bool:
    patience = time.monotonic() + 30
    while time.monotonic() < patience:
        if not any(Path(f"/proc/{child}").exists() for child in children):
            return True
        time.sleep(0.05)
    return False


needs_proc = pytest.mark.skipif(
    not Path("/proc/self/task").exists(), reason="reads the workers' ids from /proc"
)


@needs_proc
@pytest.mark.parametrize("end", [signal.SIGINT, signal.SIGKILL])
def test_workers_end_with_their_study(tmp_path: Path, end: signal.Signals) -> None:
    store = tmp_path / "store"
    process, children = _start_hanging(store)
    try:
        assert len(children) >= 2
        os.kill(process.pid, end)
        _, errors = process.communicate(timeout=30)  # the chunks would hang for 600 s
        assert _all_gone(children)
    except BaseException:  # nothing that hangs is left behind by a test that fails
        process.kill()
        for child in children:
            with contextlib.suppress(ProcessLookupError):
                os.kill(child, signal.SIGKILL)
        raise
    assert _kept(store) == {0, 2}
    if end == signal.SIGINT:
        assert errors.rstrip().endswith("KeyboardInterrupt")
        assert errors.count("Traceback") == 1  # the workers are silent


@pytest.mark.parametrize("workers", [0, -2])
def test_a_number_of_workers_below_one_is_refused(workers: int) -> None:
    with (
        pytest.raises(InputError, match="--workers: must be 1 or more"),
        study_executor(workers),
    ):
        pass


def test_workers_and_a_cluster_at_once_are_refused() -> None:
    with (
        pytest.raises(InputError, match="not both"),
        study_executor(2, "tcp://127.0.0.1:8786"),
    ):
        pass


def test_a_cluster_without_the_extra_is_told_how_to_get_it(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setitem(sys.modules, "distributed", None)
    with (
        pytest.raises(InputError, match=r"install flashplan\[cluster\]"),
        study_executor(cluster="tcp://127.0.0.1:8786"),
    ):
        pass


@pytest.mark.parametrize("address", ["tcp://127.0.0.1:1", "nowhere at all", "tcp://"])
def test_a_cluster_that_does_not_answer_is_named(
    address: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(workers_module, "_ANSWER_SECONDS", 0.5)
    with (
        pytest.raises(InputError, match="no Dask scheduler answers at") as caught,
        study_executor(cluster=address),
    ):
        pass
    assert repr(address) in caught.value.message
