"""Who does the work: this process, several local ones, or a cluster."""

import os
import signal
import socket
import threading
from collections.abc import Iterator
from concurrent.futures import CancelledError, Executor, ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing import get_context
from multiprocessing.connection import Connection
from urllib.parse import urlsplit

from flashplan.errors import InputError

_ANSWER_SECONDS = 10  # that a cluster may take to answer


@contextmanager
def study_executor(
    workers: int | None = None, cluster: str | None = None
) -> Iterator[Executor | None]:
    """Give the executor for `run_study`: None for this process, a pool of local processes, or a Dask cluster.

    workers: number of local processes, None or 1 for none; cluster: address of a Dask scheduler such as
    "tcp://host:8786", which needs the optional extra `cluster`.
    Raises InputError for a number below 1, for both at once, and for a cluster that cannot be used.
    """
    if workers is not None and workers < 1:
        raise InputError(f"must be 1 or more, found {workers}", "--workers")
    if cluster is not None:
        if workers is not None and workers > 1:
            raise InputError(
                "has workers of its own: give --workers or --cluster, not both",
                "--cluster",
            )
        with _cluster_executor(cluster) as executor:
            yield executor
    elif workers is None or workers == 1:
        yield None
    else:
        with _process_pool(workers) as executor:
            yield executor


@contextmanager
def _process_pool(workers: int) -> Iterator[Executor]:
    # Started afresh rather than forked: a fork copies locks that other threads may hold, and is not there everywhere.
    context = get_context("spawn")
    lifeline, held_end = context.Pipe(duplex=False)
    pool = ProcessPoolExecutor(
        workers, mp_context=context, initializer=_begin_worker, initargs=(lifeline,)
    )
    try:
        yield pool
    except BaseException:
        held_end.close()  # nobody waits for chunks that nobody wants any more
        raise
    finally:
        pool.shutdown(wait=True, cancel_futures=True)
        held_end.close()
        lifeline.close()


def _begin_worker(lifeline: Connection) -> None:
    """Make this process end with the one that started it, and leave interrupts to that one."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with, args=(lifeline,), daemon=True).start()


def _end_with(lifeline: Connection) -> None:
    # Nothing is ever sent: reading ends when the other end closes, be it on purpose or because its process was killed.
    try:
        lifeline.recv_bytes()
    except (EOFError, OSError):
        os._exit(1)


@contextmanager
def _cluster_executor(address: str) -> Iterator[Executor]:
    try:
        from distributed import Client, KilledWorker
    except ImportError:
        raise InputError(
            "needs the optional extra: install flashplan[cluster]", "--cluster"
        ) from None
    # A client that fails to connect is never quite closed, and blocks for ever when it is collected while another one
    # starts: knock first, so that none is made in vain.
    place = urlsplit(address if "://" in address else f"tcp://{address}")
    try:
        socket.create_connection(
            (place.hostname, place.port or 8786), timeout=_ANSWER_SECONDS
        ).close()
        client = Client(address, timeout=_ANSWER_SECONDS, set_as_default=False)
    except (OSError, TimeoutError, ValueError) as error:
        raise InputError(
            f"no Dask scheduler answers at {address!r}: {error}", "--cluster"
        ) from error
    with client, client.get_executor() as executor:
        try:
            yield executor
        except (KilledWorker, CancelledError) as error:
            raise InputError(
                f"the workers at {address!r} died or were taken away: {error}",
                "--cluster",
            ) from error
