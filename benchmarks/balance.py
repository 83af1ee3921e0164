"""
Time the daily root-zone balance of many plots over many years, with the run-on and on rain alone.

    python benchmarks/balance.py --plots 1000 --years 40 --threads 2

Prints one line of JSON. The kernels are compiled before the clock starts; weather and plots are random, seeded.
"""

import argparse
import json
import resource
import time

import numpy as np

from siting.demand import CropRecord, CropWater, Planting, PlotSoil, daily_balance, sowing_seasons


def made_record(years: int, rng: np.random.Generator) -> CropRecord:
    """Make a record of a dry climate with winter rain, and a sorghum sown at the onset of rains."""
    first = np.datetime64("1980-04-01")
    days = np.arange(first, first + 366 * (years + 1) + 2)
    season = np.cos(2.0 * np.pi * ((days - first).astype(np.int64) - 290) / 365.25)
    wet = rng.random(days.size) < 0.02 + 0.10 * np.maximum(season, 0.0)
    rain = np.where(wet, rng.exponential(9.0, days.size), 0.0)
    crop = CropWater((20, 35, 45, 30), (0.3, 1.05, 0.55), 1.5, 0.55, 0.9)
    planting = Planting((11, 1), (1, 15))
    seasons = sowing_seasons(days, planting=planting, crop=crop)
    return CropRecord(days, rain, 4.5 - 2.5 * season, seasons, crop, planting)


def main() -> None:
    """Read the sizes, run both passes and print the figures."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--plots", type=int, default=1000)
    parser.add_argument("--years", type=int, default=40)
    parser.add_argument("--threads", type=int, default=2)
    asked = parser.parse_args()
    rng = np.random.default_rng(1)
    record, plots = made_record(asked.years, rng), asked.plots
    storms = np.maximum(record.rain_mm - 9.0, 0.0) ** 2 / (record.rain_mm + 36.0)
    runon = rng.uniform(5.0, 200.0, plots)[:, None] * storms[None, :]
    rate = rng.choice([7.5, 12.5, 25.0], plots)
    soil = PlotSoil(
        rng.uniform(80.0, 170.0, plots),
        rng.uniform(0.5, 2.0, plots),
        np.full(plots, 9.0),
        np.full(plots, 19.0),
        rate,
        np.full(plots, 200.0),
    )
    area = rng.uniform(1000.0, 10_000.0, plots)
    one = np.zeros(1, dtype=np.int64)
    for volume in (runon[:1], None):  # compiles
        daily_balance(record, runon_m3=volume, soil=soil.take(one), plot_area_m2=area[:1], threads=1)
    start = time.perf_counter()
    fed = daily_balance(record, runon_m3=runon, soil=soil, plot_area_m2=area, threads=asked.threads)
    middle = time.perf_counter()
    alone = daily_balance(record, runon_m3=None, soil=soil, plot_area_m2=area, threads=asked.threads)
    end = time.perf_counter()
    report = {
        "plots": plots,
        "seasons": int(fed.label.size),
        "threads": asked.threads,
        "with_runon_s": middle - start,
        "rain_alone_s": end - middle,
        "mean_yield": float(fed.relative_yield.mean()),
        "mean_yield_rain_alone": float(alone.relative_yield.mean()),
        "peak_bytes": 1024.0 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss,
    }
    print(json.dumps({name: round(value, 4) for name, value in report.items()}))


if __name__ == "__main__":
    main()
