"""Run a study: a task over chunks by index, on any executor, with the same result whoever does the work."""

from collections.abc import Callable, Generator, Iterator
from concurrent.futures import (
    BrokenExecutor,
    Executor,
    Future,
    as_completed,
)
from contextlib import ExitStack, closing
from pathlib import Path
from typing import Any

import numpy as np

from flashplan.errors import InputError
from flashplan.study.fingerprint import study_fingerprint
from flashplan.study.progress import NoProgress, Progress
from flashplan.study.seeds import chunk_generator
from flashplan.study.store import Store
from flashplan.study.threads import (
    one_thread,
    one_thread_from_now_on,
    process_name,
)

Task = Callable[[int, np.random.Generator], Any]


def run_study(
    task: Task,
    chunks: int,
    *,
    seed: int,
    store: str | Path | None = None,
    executor: Executor | None = None,
    progress: Progress | None = None,
) -> list[Any]:
    """Return task(index, generator) for index 0 .. chunks - 1, in this order.

    task: must do the same whenever it is given the same index and generator, which is the chunk's own; a function, a
    partial of one, or a dataclass with __call__, picklable where the executor needs that. Its result, where a store is
    used, is what `encode_result` accepts.
    store: file that keeps chunks as they finish. A study that was broken off, by an interrupt, a full disk, an error
    or a kill, finds them there and ends with the identical list; another study is refused.
    executor: any concurrent.futures.Executor, None for this process. It is not shut down.
    Raises InputError for a store that is unfit or cannot be written and for workers that died, and whatever the task
    raises; in each case what was finished is kept.
    """
    progress = progress or NoProgress()
    with ExitStack() as stack:
        stack.enter_context(one_thread())
        kept: Store | None = None
        found: dict[int, Any] = {}
        if store is not None:
            fingerprint = study_fingerprint(task, chunks, seed)
            kept = stack.enter_context(Store(store, fingerprint))
            found = kept.finished()
        missing = [index for index in range(chunks) if index not in found]
        stack.callback(progress.end)
        progress.begin(chunks, len(found))
        results = stack.enter_context(closing(_results(task, missing, seed, executor)))
        for index, result in results:
            if kept is not None:
                kept.keep(index, result)
            found[index] = result
            progress.advance()
    return [found[index] for index in range(chunks)]


def _results(
    task: Task, missing: list[int], seed: int, executor: Executor | None
) -> Generator[tuple[int, Any], None, None]:
    """Yield each missing chunk's index and result as it finishes."""
    if executor is None:
        for index in missing:
            yield index, task(index, chunk_generator(seed, index))
        return
    waiting: dict[Future[Any], int] = {}
    try:
        for index in missing:
            future = executor.submit(_run_elsewhere, task, seed, index, process_name())
            waiting[future] = index
        for future in as_completed(tuple(waiting)):
            result = future.result()
            yield waiting.pop(future), result
    except (Exception, KeyboardInterrupt) as error:
        # Others may have finished in the moment in which this one failed, or the person's patience ended.
        yield from _finished(waiting)
        if isinstance(error, BrokenExecutor):
            raise InputError(
                "a worker process died, perhaps for want of memory, or because a script that starts workers lacks "
                'its `if __name__ == "__main__":`; fewer workers need less memory',
                "--workers",
            ) from error
        raise
    finally:
        for future in waiting:
            future.cancel()


def _run_elsewhere(task: Task, seed: int, index: int, asked_by: str) -> Any:
    """Run one chunk in whatever thread or process it was sent to."""
    if process_name() != asked_by:
        one_thread_from_now_on()
    return task(index, chunk_generator(seed, index))


def _finished(waiting: dict[Future[Any], int]) -> Iterator[tuple[int, Any]]:
    for future, index in waiting.items():
        if future.done() and not future.cancelled() and future.exception() is None:
            yield index, future.result()
