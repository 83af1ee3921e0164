"""What a run will take, said before it starts."""

import os
import shutil
from dataclasses import dataclass
from pathlib import Path

import rasterio
from rasterio.errors import RasterioError

from siting.errors import CapacityError

BYTES_PER_CELL = 110
"""Peak memory of a run for each cell, measured (see benchmarks), rounded up."""

DISK_BYTES_PER_CELL = 45
"""Results and what is written on the way, for each cell, at worst: ten rasters that do not compress."""

BASE_DISK_BYTES = 20e6
"""Layers, tables and styles of a run with some hundred plots."""

BASE_BYTES = 700e6
"""Memory of the libraries themselves and of a rain record."""

SECONDS_PER_MILLION_CELLS = 2.0
"""Measured on two cores of a small machine; a guide, no promise."""


@dataclass(frozen=True, slots=True)
class Forecast:
    """Cells of a DEM, and what a run on it will take: bytes of memory and disk, seconds; `free_*` is what there is."""

    cells: int
    memory_bytes: float
    disk_bytes: float
    seconds: float
    free_memory_bytes: float | None
    free_disk_bytes: float | None


def forecast(dem: Path, out: Path) -> Forecast | None:
    """Forecast a run from the size of its DEM; None where that cannot be read, which the reader will explain."""
    try:
        with rasterio.open(dem) as file:
            cells = int(file.width) * int(file.height)
    except (RasterioError, OSError):
        return None
    return Forecast(
        cells,
        BASE_BYTES + BYTES_PER_CELL * cells,
        BASE_DISK_BYTES + DISK_BYTES_PER_CELL * cells,
        10.0 + SECONDS_PER_MILLION_CELLS * cells / 1e6,
        _free_memory_bytes(),
        _free_disk_bytes(out),
    )


def refuse_what_does_not_fit(dem: Path, out: Path) -> None:
    """Raise CapacityError, with figures, before a run that would not fit into memory or onto the disk."""
    found = forecast(dem, out)
    if found is None:
        return
    for what, needed, free, way_out in (
        ("memory", found.memory_bytes, found.free_memory_bytes, "cut the elevation model smaller or take larger cells"),
        ("disk", found.disk_bytes, found.free_disk_bytes, "free some, or name another folder with --out"),
    ):
        if free is not None and needed > free:
            msg = f"{found.cells} cells need {_size(needed)} of {what} and {_size(free)} are free; {way_out}"
            raise CapacityError(msg)


def _size(number: float) -> str:
    """Write bytes in GB, or in MB where they are few."""
    return f"{number / 1e9:.1f} GB" if number >= 1e9 else f"{number / 1e6:.0f} MB"


def _free_memory_bytes() -> float | None:
    """Return the memory that can still be had, None where the system does not tell."""
    try:
        for line in Path("/proc/meminfo").read_text(encoding="ascii").splitlines():
            if line.startswith("MemAvailable:"):
                return float(line.split()[1]) * 1024
        return float(os.sysconf("SC_AVPHYS_PAGES") * os.sysconf("SC_PAGE_SIZE"))
    except (OSError, ValueError, AttributeError):
        return None


def _free_disk_bytes(out: Path) -> float | None:
    """Return the room on the disk of the nearest folder that exists."""
    for folder in (out.absolute(), *out.absolute().parents):
        if folder.exists():
            return float(shutil.disk_usage(folder).free)
    return None
