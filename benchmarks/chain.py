"""
Time the terrain chain beside richdem on a made fractal DEM: fill, directions, area, slope, wetness.

    python benchmarks/chain.py --cells 4000000 --json

Each side runs in a process of its own, warm (a small raster first, so that nothing is compiled while timed), so peak
memory is each side's alone. Multiple-flow area, which the wetness index of `siting.terrain.analyse` uses, is timed
apart: the chain compared is the same on both sides, with the single-direction area in the wetness index.
"""

import argparse
import json
import resource
import subprocess
import sys
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import numpy.typing as npt

Heights = npt.NDArray[np.float32]


def fractal(side: int) -> Heights:
    """Make ground whose power falls with frequency, 500 m high, 60 m of relief."""
    rng = np.random.default_rng(1)
    rows = np.fft.fftfreq(side).astype(np.float32)[:, None]
    cols = np.fft.rfftfreq(side).astype(np.float32)[None, :]
    spectrum = np.fft.rfft2(rng.standard_normal((side, side), dtype=np.float32))
    frequency = np.hypot(rows, cols)
    frequency[0, 0] = 1.0
    spectrum *= frequency**-1.6
    spectrum[0, 0] = 0.0
    z = np.fft.irfft2(spectrum, s=(side, side))
    return np.ascontiguousarray(500.0 + 60.0 * z / z.std(), dtype=np.float32)


def ours(z: Heights, report: dict[str, float]) -> None:
    """Run the chain of this package; note its stages in seconds."""
    from siting.terrain import accumulate, condition, multiple_flow_area, slope, wetness_index

    size = np.full(z.shape[0], 10.0)
    cells: dict[str, Any] = {"cell_width_m": size, "cell_height_m": size}
    start = time.perf_counter()
    done = condition(z, sinks=None, threads=2, **cells)
    report["condition_s"] = time.perf_counter() - start
    area = accumulate(done.direction, size * 10.0, threads=2)
    report["area_s"] = time.perf_counter() - start - report["condition_s"]
    tangent = slope(z, threads=2, **cells)
    wetness_index(area, tangent, threads=2, **cells)
    report["siting_s"] = time.perf_counter() - start
    report["undrained"] = float(np.count_nonzero(done.direction == 0))
    report["mass_error_m2"] = float(abs(area[done.direction == 9].sum() - 100.0 * z.size))
    report["chain_peak_bytes"] = peak_bytes()
    start = time.perf_counter()
    multiple_flow_area(done.filled, done.direction, cell_area_m2=size * 10.0, **cells)
    report["multiple_flow_s"] = time.perf_counter() - start


def theirs(z: Heights, report: dict[str, float]) -> None:
    """Run richdem's chain: epsilon fill, D8 accumulation, slope, wetness."""
    import richdem

    raster = richdem.rdarray(z, no_data=-9999.0)
    raster.geotransform = (0.0, 10.0, 0.0, 0.0, 0.0, -10.0)
    start = time.perf_counter()
    filled = richdem.FillDepressions(raster, epsilon=True)
    area = richdem.FlowAccumulation(filled, method="D8")
    tangent = richdem.TerrainAttribute(raster, attrib="slope_riserun")
    np.log(np.asarray(area) * 10.0 / np.maximum(np.asarray(tangent), 0.001))
    report["richdem_s"] = time.perf_counter() - start


def peak_bytes() -> float:
    """Return the peak memory of this process so far."""
    return 1024.0 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss


def one_side(name: str, path: str) -> None:
    """Run one side in this process and print its report."""
    run: Callable[[Heights, dict[str, float]], None] = ours if name == "siting" else theirs
    run(fractal(256), {})
    before = peak_bytes()
    report: dict[str, float] = {}
    run(np.load(path), report)
    report["peak_bytes"] = report.pop("chain_peak_bytes", peak_bytes())
    report["before_bytes"] = before
    sys.stdout.write("\n" + json.dumps(report) + "\n")


def main() -> None:
    """Run both sides and print them together."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cells", type=int, default=4_000_000)
    parser.add_argument("--json", action="store_true")
    parser.add_argument("--side", nargs=2, metavar=("NAME", "FILE"), help=argparse.SUPPRESS)
    asked = parser.parse_args()
    if asked.side:
        one_side(*asked.side)
        return
    import tempfile

    with tempfile.TemporaryDirectory() as folder:
        path = f"{folder}/dem.npy"
        z = fractal(round(asked.cells**0.5))
        np.save(path, z)
        sides = {}
        for name in ("siting", "richdem"):
            command = [sys.executable, __file__, "--side", name, path]
            printed = subprocess.run(command, check=True, capture_output=True, text=True).stdout
            sides[name] = json.loads(printed.strip().splitlines()[-1])
    mine, other = sides["siting"], sides["richdem"]
    result = {
        "cells": z.size,
        "siting_s": mine["siting_s"],
        "richdem_s": other["richdem_s"],
        "ratio": mine["siting_s"] / other["richdem_s"],
        "peak_bytes_per_cell": mine["peak_bytes"] / z.size,
        "richdem_peak_bytes_per_cell": other["peak_bytes"] / z.size,
        "undrained": int(mine["undrained"]),
        "mass_error_m2": mine["mass_error_m2"],
        "condition_s": mine["condition_s"],
        "area_s": mine["area_s"],
        "multiple_flow_s": mine["multiple_flow_s"],
    }
    if asked.json:
        print(json.dumps(result))
        return
    for name, value in result.items():
        print(f"{name:28} {value:.6g}")


if __name__ == "__main__":
    main()
