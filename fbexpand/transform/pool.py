"""A batch shared out over threads: every one takes a run of neighbouring profiles."""

from __future__ import annotations

import os
import threading
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from itertools import pairwise

from fbexpand.types import FloatArray

_pools: dict[tuple[int, int], ThreadPoolExecutor] = {}
_lock = threading.Lock()


def in_threads(
    run: Callable[[FloatArray, FloatArray], None], rows: FloatArray, out: FloatArray, threads: int
) -> None:
    """Call run(rows, out) on `threads` parts of the rows at once; the first part in the calling thread."""
    parts = min(threads, len(rows))
    ends = [len(rows) * i // parts for i in range(parts + 1)]
    pool = _pool(parts - 1)
    waiting = [pool.submit(run, rows[a:b], out[a:b]) for a, b in pairwise(ends[1:])]
    try:
        run(rows[: ends[1]], out[: ends[1]])
    finally:
        for future in waiting:
            future.result()


def _pool(threads: int) -> ThreadPoolExecutor:
    """Return the pool of so many threads; after a fork the child makes its own."""
    key = (os.getpid(), threads)
    pool = _pools.get(key)
    if pool is None:
        with _lock:
            pool = _pools.setdefault(key, ThreadPoolExecutor(threads, thread_name_prefix="fbexpand"))
    return pool
