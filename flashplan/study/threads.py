"""One thread for linear algebra while a study runs, since its rounding depends on how many threads share a sum."""

import functools
import os
import platform

from threadpoolctl import threadpool_limits


def one_thread() -> threadpool_limits:
    """Hold the linear algebra of this process to one thread, until the returned context ends, or for good.

    Sums that are split over two threads are rounded in another order: the same product of matrices differs in its last
    bits between a laptop's eight threads and a cluster worker's one. Studies are parallel over chunks instead.
    """
    # SciPy brings a library of its own, which can be held back only once it is there.
    import scipy.linalg  # noqa: F401

    return threadpool_limits(1)


@functools.cache
def one_thread_from_now_on() -> None:
    """Hold this process, which does nothing but a study's chunks, to one thread."""
    one_thread()


def process_name() -> str:
    """Return a name that tells this process from those of other workers."""
    return f"{platform.node()} {os.getpid()}"
