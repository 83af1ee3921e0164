"""
Time the terrain chain beside richdem on a made fractal DEM, and the whole terrain of a place alone.

    python benchmarks/chain.py --cells 25000000 --repeats 3 --json

The chain is fill, directions, area, slope and wetness index. Both sides are asked for the same: single-direction area,
and it goes into the wetness index. Every run is a process of its own, warm (a small raster first, so that nothing is
compiled while timed) and with fresh memory; the sides take turns. Times are medians, peak memory is the greatest seen,
with the interpreter, its libraries and the DEM in it; `idle_bytes` is the peak before the DEM is read.

`further_layer_s` is one more sum down the same directions. `multiple_flow_s` is the area shared among all lower
neighbours. `analyse_s` is all that `siting.terrain.analyse` makes, by stage in `analyse_stages_s`. `--first-run` also
times the first terrain on this machine, with everything to compile, and a later one. `missed` names what lies above
its `must`; the limits of time and memory are meant for 100 million cells on two cores.
"""

import argparse
import json
import os
import resource
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from statistics import median
from typing import Any

import numpy as np
import numpy.typing as npt

Heights = npt.NDArray[np.float32]
Report = dict[str, Any]

CELL_M = 10.0
STATUS = Path("/proc/self/status")

MUST = {
    "ratio": 0.25,
    "peak_bytes_per_cell": 26.0,
    "further_layer_ns_per_cell": 10.0,
    "undrained": 0,
    "mass_error_m2": 0.0,
    "first_run_s": 10.0,
    "later_run_s": 1.0,
}
"""Greatest value that is good enough."""


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


class Watch:
    """Note in a report how long each stage took."""

    def __init__(self, report: Report) -> None:
        self.report = report
        self.start = self.last = time.perf_counter()

    def lap(self, name: str) -> None:
        """Note the seconds since the last lap."""
        now = time.perf_counter()
        self.report[name], self.last = now - self.last, now

    def all(self, name: str) -> None:
        """Note the seconds since the start."""
        self.report[name] = time.perf_counter() - self.start


def chain(z: Heights, threads: int, report: Report) -> None:
    """Run the chain of this package; no surface is kept longer than the chain needs it."""
    from siting.terrain import accumulate, condition, multiple_flow_area, slope, wetness_index

    size = np.full(z.shape[0], CELL_M)
    cells: dict[str, Any] = {"cell_width_m": size, "cell_height_m": size, "threads": threads}
    watch = Watch(report)
    direction = condition(z, sinks=None, **cells).direction
    watch.lap("condition_s")
    area = accumulate(direction, size * CELL_M, threads=threads)
    watch.lap("area_s")
    tangent = slope(z, **cells)
    watch.lap("slope_s")
    wetness = wetness_index(area, tangent, **cells)
    watch.lap("wetness_s")
    watch.all("siting_s")
    report["peak_bytes"] = peak_bytes()
    report["undrained"] = int(np.count_nonzero(direction == 0))
    report["mass_error_m2"] = float(abs(area[direction == 9].sum() - CELL_M**2 * z.size))
    del tangent, wetness, area
    watch = Watch(report)
    accumulate(direction, np.full(z.shape[0], 1.0), threads=threads)
    watch.lap("further_layer_s")
    filled = condition(z, sinks=None, **cells).filled
    watch = Watch(report)
    multiple_flow_area(filled, direction, cell_area_m2=size * CELL_M, **cells)
    watch.lap("multiple_flow_s")


def richdem(z: Heights, _threads: int, report: Report) -> None:
    """Run richdem's chain: epsilon fill, D8 accumulation, slope, wetness; it chooses its threads itself."""
    import richdem

    raster = richdem.rdarray(z, no_data=-9999.0)
    raster.geotransform = (0.0, CELL_M, 0.0, 0.0, 0.0, -CELL_M)
    watch = Watch(report)
    filled = richdem.FillDepressions(raster, epsilon=True)
    area = richdem.FlowAccumulation(filled, method="D8")
    del filled
    tangent = np.asarray(richdem.TerrainAttribute(raster, attrib="slope_riserun"))
    wetness = np.asarray(area) * CELL_M
    wetness /= np.maximum(tangent, 0.001)
    np.log(wetness, out=wetness)
    watch.all("richdem_s")
    report["peak_bytes"] = peak_bytes()


def analyse(z: Heights, threads: int, report: Report) -> None:
    """Make the whole terrain of a place that keeps pans from a hectare on."""
    from siting.grid import Raster, metric_grid
    from siting.terrain import analyse

    stages: Report = {}
    watch, laps = Watch(report), Watch(stages)
    analyse(
        Raster(metric_grid(z.shape[0], z.shape[1], CELL_M), z),
        vertical_error_m=1.0,
        channel_area_m2=100_000.0,
        pan_min_area_m2=10_000.0,
        pan_layer=None,
        threads=threads,
        progress=lambda stage, _done, _total: laps.lap(stage),
    )
    watch.all("analyse_s")
    report["stages"] = stages
    report["peak_bytes"] = peak_bytes()


SIDES: dict[str, Callable[[Heights, int, Report], None]] = {"chain": chain, "richdem": richdem, "analyse": analyse}


def peak_bytes() -> float:
    """Return the peak memory of this process so far."""
    if STATUS.exists():  # a new process takes over the peak of its parent in ru_maxrss, not in this
        return 1024.0 * next(int(line.split()[1]) for line in STATUS.read_text().splitlines() if line.startswith("VmHWM:"))
    return 1024.0 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss


def one_side(name: str, path: str, threads: int) -> None:
    """Run one side in this process, warm, and print its report."""
    SIDES[name](fractal(256), threads, {})
    report: Report = {"idle_bytes": peak_bytes()}
    SIDES[name](np.load(path), threads, report)
    sys.stdout.write("\n" + json.dumps(report) + "\n")


def run_side(name: str, path: str, threads: int) -> Report:
    """Run one side in a process of its own."""
    command = [sys.executable, __file__, "--threads", str(threads), "--side", name, path]
    printed = subprocess.run(command, check=True, capture_output=True, text=True).stdout
    report: Report = json.loads(printed.strip().splitlines()[-1])
    return report


def first_runs(folder: str) -> Report:
    """Time a terrain of few cells in a new process, first with an empty folder of compiled kernels, then again."""
    environment = os.environ | {"NUMBA_CACHE_DIR": f"{folder}/compiled"}
    np.save(f"{folder}/small.npy", fractal(64))
    code = f"import sys; sys.path.insert(0, {str(Path(__file__).parent)!r}); import numpy, chain; "
    code += f"report = {{}}; chain.analyse(numpy.load({folder!r} + '/small.npy'), 2, report); print(report['analyse_s'])"
    seconds = []
    for _ in range(2):
        done = subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, text=True, env=environment)
        seconds.append(float(done.stdout.split()[-1]))
    return {"first_run_s": seconds[0], "later_run_s": seconds[1]}


def summed_up(cells: int, runs: dict[str, list[Report]]) -> Report:
    """Put medians and peaks of all runs in one report."""

    def middle(side: str, name: str) -> float:
        return float(median(run[name] for run in runs[side]))

    def peak(side: str) -> float:
        return float(max(run["peak_bytes"] for run in runs[side])) / cells

    ours, theirs = middle("chain", "siting_s"), middle("richdem", "richdem_s")
    stages = ("condition_s", "area_s", "slope_s", "wetness_s", "further_layer_s", "multiple_flow_s")
    return {
        "cells": cells,
        "siting_s": ours,
        "richdem_s": theirs,
        "ratio": ours / theirs,
        "peak_bytes_per_cell": peak("chain"),
        "idle_bytes": max(run["idle_bytes"] for run in runs["chain"]),
        "richdem_peak_bytes_per_cell": peak("richdem"),
        "undrained": max(run["undrained"] for run in runs["chain"]),
        "mass_error_m2": max(run["mass_error_m2"] for run in runs["chain"]),
        "siting_ns_per_cell": 1e9 * ours / cells,
        **{name: middle("chain", name) for name in stages},
        "further_layer_ns_per_cell": 1e9 * middle("chain", "further_layer_s") / cells,
        "analyse_s": middle("analyse", "analyse_s"),
        "analyse_ns_per_cell": 1e9 * middle("analyse", "analyse_s") / cells,
        "analyse_peak_bytes_per_cell": peak("analyse"),
        "analyse_stages_s": {
            stage: float(median(run["stages"][stage] for run in runs["analyse"])) for stage in runs["analyse"][0]["stages"]
        },
    }


def main() -> None:
    """Run all sides in turn and print them together."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--cells", type=int, default=4_000_000)
    parser.add_argument("--repeats", type=int, default=3)
    parser.add_argument("--threads", type=int, default=2)
    parser.add_argument("--first-run", action="store_true")
    parser.add_argument("--json", action="store_true")
    parser.add_argument("--side", nargs=2, metavar=("NAME", "FILE"), help=argparse.SUPPRESS)
    asked = parser.parse_args()
    if asked.side:
        name, path = asked.side
        one_side(name, path, asked.threads)
        return
    runs: dict[str, list[Report]] = {name: [] for name in SIDES}
    with tempfile.TemporaryDirectory() as folder:
        path = f"{folder}/dem.npy"
        z = fractal(round(asked.cells**0.5))
        np.save(path, z)
        cells = z.size
        del z
        for _ in range(asked.repeats):
            for name, seen in runs.items():
                seen.append(run_side(name, path, asked.threads))
        result = summed_up(cells, runs) | (first_runs(folder) if asked.first_run else {})
    result["must"] = MUST
    result["missed"] = [name for name, most in MUST.items() if name in result and result[name] > most]
    if asked.json:
        print(json.dumps(result))
        return
    for name, value in result.items():
        print(f"{name:30} {value:.6g}" if isinstance(value, int | float) else f"{name:30} {json.dumps(value)}")


if __name__ == "__main__":
    main()
