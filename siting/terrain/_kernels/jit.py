"""
How kernels are compiled: strict floating point, lock released, kept on disk where that is possible.

A division by zero gives infinity or NaN, as between arrays: a test for it in every division keeps loops from vectorising.
"""

from collections.abc import Callable
from typing import Any

import numpy as np
from numba import njit


def kernel(function: Callable[..., Any]) -> Callable[..., Any]:
    """Compile a kernel; where no folder takes its compiled form (a read-only home) go without one."""
    try:
        compiled: Callable[..., Any] = njit(cache=True, nogil=True, error_model="numpy")(function)
    except RuntimeError:
        compiled = njit(nogil=True, error_model="numpy")(function)
    return compiled


def part(function: Callable[..., Any]) -> Callable[..., Any]:
    """Make a part of kernels, written into each that calls it: handing arrays to a call costs more than a cell's work."""
    written_in: Callable[..., Any] = njit(nogil=True, error_model="numpy", inline="always")(function)
    return written_in


@part
def at(array, place):
    """Read a flat array at a place known to be 0 or above: spares the test for places counted from the end."""
    return array[np.uint64(place)]
