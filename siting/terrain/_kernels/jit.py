"""How kernels are compiled: strict floating point, lock released, kept on disk where that is possible."""

from collections.abc import Callable
from typing import Any

from numba import njit


def kernel(function: Callable[..., Any]) -> Callable[..., Any]:
    """Compile a kernel; where no folder takes its compiled form (a read-only home) go without one."""
    try:
        compiled: Callable[..., Any] = njit(cache=True, nogil=True)(function)
    except RuntimeError:
        compiled = njit(nogil=True)(function)
    return compiled
