"""
Time the doubt of the order: many draws, and what would swap neighbours in rank.

    python benchmarks/doubt.py --plots 1000 --years 40 --draws 500 --threads 2

Prints one line of JSON. The kernel is compiled before the clock starts; weather and plots are random, seeded.
"""

import argparse
import json
import resource
import time

import numpy as np

from siting.demand import season_days
from siting.ranking import PlotInputs, Spread, SupplyModel, neighbour_swaps, rank_doubt, supply_model
from siting.runoff import RunoffClasses

LOSSES = np.array([0.1, 0.2, 0.3, 0.5, 0.8])


def made_plots(count: int, classes: int, rng: np.random.Generator) -> PlotInputs:
    """Make plots of three soils with catchments of 1 to 100 times their area, up to 2 km long."""
    plot = rng.uniform(1000.0, 10_000.0, count)
    share = rng.dirichlet(np.full(classes, 0.4), count)
    distance_km = rng.uniform(0.05, 2.0, (count, classes))
    ground = share * (plot * np.exp(rng.uniform(0.0, np.log(100.0), count)))[:, None]
    soil = rng.integers(0, 3, count)
    return PlotInputs(
        effective_area_m2=ground * np.exp(-LOSSES[:, None, None] * distance_km),
        loss_per_km=LOSSES,
        bed_area_m2=2.0 * rng.uniform(0.0, 1000.0, count),
        plot_area_m2=plot,
        available_water_mm=np.array([90.0, 150.0, 220.0])[soil],
        ponding_mm=np.full(count, 200.0),
        infiltration_mm=np.array([150.0, 75.0, 45.0])[soil],
        soil_class=soil,
        open_catchment=rng.random(count) < 0.05,
        peak_flow_10y_m3s=np.full(count, np.nan),
        plot_id=np.arange(1, count + 1),
    )


def made_model(count: int, years: int, classes: int, rng: np.random.Generator) -> SupplyModel:
    """Make a record of a dry climate with winter rain, and a crop sown in November."""
    first = np.datetime64("1980-04-01")
    days = np.arange(first, first + 366 * (years + 1) + 2)
    winter = np.cos(2.0 * np.pi * ((days - first).astype(np.int64) - 290) / 365.25)
    wet = rng.random(days.size) < 0.02 + 0.16 * np.maximum(winter, 0.0)
    return supply_model(
        plots=made_plots(count, classes, rng),
        classes=RunoffClasses(np.zeros((0, 0), dtype=np.uint16), np.linspace(68.0, 94.0, classes), np.full(classes, np.nan)),
        cover_of_class=np.arange(classes) // 2,
        rain_mm=np.where(wet, rng.exponential(9.0, days.size), 0.0),
        et0_mm=4.5 - 2.5 * winter,
        seasons=season_days(days, planting=(11, 15), season_length_days=130),
        stage_days=(20, 35, 45, 30),
        kc=(0.3, 1.05, 0.55),
        abstraction_ratio=0.2,
        loss_per_km=0.3,
        channel_wetting_mm=25.0,
        efficiency=0.65,
        dependable_share=0.8,
    )


def main() -> None:
    """Read the sizes, run both parts and print the figures."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--plots", type=int, default=1000)
    parser.add_argument("--years", type=int, default=40)
    parser.add_argument("--classes", type=int, default=10)
    parser.add_argument("--draws", type=int, default=500)
    parser.add_argument("--threads", type=int, default=2)
    asked = parser.parse_args()
    rng = np.random.default_rng(1)
    model, spread = made_model(asked.plots, asked.years, asked.classes, rng), Spread()
    rank_doubt(model, spread, draws=1, seed=0)  # compiles
    start = time.perf_counter()
    found = rank_doubt(model, spread, draws=asked.draws, seed=1, threads=asked.threads)
    middle = time.perf_counter()
    swaps = neighbour_swaps(model, spread, threads=asked.threads)
    end = time.perf_counter()
    report = {
        "plots": asked.plots,
        "seasons": int(model.season.size),
        "days": int(model.bounds[-1, 2]),
        "rain_days": int(model.day.size),
        "draws": asked.draws,
        "threads": asked.threads,
        "draws_s": round(end - start - (end - middle), 2),
        "swaps_s": round(end - middle, 2),
        "mean_width": round(float(np.mean(found.rank_high - found.rank_low)), 1),
        "pairs_that_swap": int((swaps.change_sd > 0).sum()),
        "peak_bytes": 1024 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss,
    }
    print(json.dumps(report))


if __name__ == "__main__":
    main()
