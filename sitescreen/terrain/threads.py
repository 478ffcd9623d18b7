"""Runs a compiled kernel over bands of rows or lines on every processor this process may use."""

import os
import threading
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from itertools import pairwise
from typing import Any


def thread_count() -> int:
    """Processors that this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


_own = threading.local()


def work_alone() -> None:
    """Let this thread run its kernels by itself: for pools that have a thread a processor at work already."""
    _own.alone = True


def in_bands(kernel: Callable[..., None], count: int, *arguments: Any, bands_a_thread: int = 1) -> None:
    """Call ``kernel(*arguments, start, stop)`` for bands that together cover 0 … count.

    Kernels are compiled nogil and write each cell in exactly one band, so results do not depend on the number of
    threads. Python threads start in half the time of numba's own, and need no second, slower compilation.

    Parameters
    ----------
    kernel : compiled function
        Takes the arguments, then the first item and the item behind the last.
    count : int
        Rows or lines in all.
    bands_a_thread : int
        More than 1 where bands differ in cost, so that no processor waits long for another.
    """
    threads = 1 if getattr(_own, "alone", False) else thread_count()
    bands = max(1, min(count, threads * bands_a_thread))
    edges = [count * band // bands for band in range(bands + 1)]
    if bands == 1 or threads == 1:
        for start, stop in pairwise(edges):
            kernel(*arguments, start, stop)
        return
    with ThreadPoolExecutor(threads) as pool:
        jobs = [pool.submit(kernel, *arguments, start, stop) for start, stop in pairwise(edges)]
        for job in jobs:
            job.result()
