"""Seconds and peak memory of each stage."""

import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path

from siting.progress import Progress

STATUS, RESET = Path("/proc/self/status"), Path("/proc/self/clear_refs")
RESET_PEAK = "5"
"""What the kernel takes as: forget the peak of resident memory."""


@dataclass(slots=True)
class Clock:
    """Hears the stages, times them, and keeps the highest resident memory of each, in bytes."""

    progress: Progress
    seconds: dict[str, float] = field(default_factory=dict)
    peak_bytes: dict[str, int] = field(default_factory=dict)

    @contextmanager
    def stage(self, name: str) -> Iterator[None]:
        """Time what is done inside, and tell the listener before and after."""
        self.progress.stage(name, 0, 1)
        _forget_peak()
        begun = time.perf_counter()
        yield
        self.seconds[name] = time.perf_counter() - begun
        self.peak_bytes[name] = peak_resident_bytes()
        self.progress.stage(name, 1, 1)

    @property
    def total_seconds(self) -> float:
        """Return the sum over all stages."""
        return sum(self.seconds.values())

    def record(self) -> dict[str, dict[str, float]]:
        """Return seconds and peak memory by stage, for the run record."""
        return {
            name: {"seconds": round(seconds, 3), "peak_memory_mb": round(self.peak_bytes[name] / 1e6, 1)}
            for name, seconds in self.seconds.items()
        }


def _forget_peak() -> None:
    """Begin the peak anew where the system can; elsewhere it is that of the whole process so far."""
    try:
        RESET.write_text(RESET_PEAK, encoding="ascii")
    except OSError:
        return


def peak_resident_bytes() -> int:
    """Return the highest resident memory since the peak was last forgotten; 0 where the system does not tell."""
    try:
        for line in STATUS.read_text(encoding="ascii").splitlines():
            if line.startswith("VmHWM:"):
                return int(line.split()[1]) * 1024
    except OSError:
        pass
    try:
        import resource  # not on every system
    except ImportError:
        return 0
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    return peak if sys.platform == "darwin" else peak * 1024
