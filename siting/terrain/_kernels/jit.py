"""
How kernels are compiled: strict floating point, lock released, kept on disk where that is possible.

A division by zero gives infinity or NaN, as between arrays: a test for it in every division keeps loops from vectorising.
"""

from collections.abc import Callable
from typing import Any

import numpy as np
from numba import njit

OPTIONS: dict[str, Any] = {"nogil": True, "error_model": "numpy", "no_cfunc_wrapper": True}
PART_OPTIONS: dict[str, Any] = OPTIONS | {"forceinline": True, "no_cpython_wrapper": True}


def kernel(function: Callable[..., Any]) -> Callable[..., Any]:
    """Compile a kernel; where no folder takes its compiled form (a read-only home) go without one."""
    try:
        compiled: Callable[..., Any] = njit(cache=True, **OPTIONS)(function)
    except RuntimeError:
        compiled = njit(**OPTIONS)(function)
    return compiled


def part(function: Callable[..., Any]) -> Callable[..., Any]:
    """Compile a part of kernels into each that calls it: handing arrays to a call costs more than the work on a cell."""
    compiled: Callable[..., Any] = njit(**PART_OPTIONS)(function)
    return compiled


@part
def at(array, place):
    """Read a flat array at a place known to be 0 or above: spares the test for places counted from the end."""
    return array[np.uint64(place)]
