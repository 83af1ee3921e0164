"""Work on threads: kernels release the interpreter lock, so plain threads suffice."""

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import Any


def usable_threads(asked: int | None = None) -> int:
    """Return the number of threads to use: as asked, else as many as this process may run on."""
    if asked is not None:
        return max(1, asked)
    try:
        return max(1, len(os.sched_getaffinity(0)))
    except AttributeError:  # not on every system
        return max(1, os.cpu_count() or 1)


def run_all(work: Callable[..., Any], parts: Sequence[tuple[Any, ...]], threads: int) -> list[Any]:
    """Call `work(*part)` for every part on `threads` threads; results keep the order of parts."""
    if threads <= 1 or len(parts) <= 1:
        return [work(*part) for part in parts]
    with ThreadPoolExecutor(threads) as pool:
        return list(pool.map(lambda part: work(*part), parts))
