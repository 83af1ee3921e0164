"""
Draw the map of the demo's results that the read-me shows.

Run `siting demo FOLDER`, then `python docs/make_picture.py FOLDER`; it needs matplotlib, which comes with the tests.
"""

import sys
from pathlib import Path
from typing import Any

import geopandas as gpd
import matplotlib
import numpy as np
import rasterio
from matplotlib import pyplot
from matplotlib.lines import Line2D
from matplotlib.patches import Patch, Rectangle
from matplotlib.patheffects import withStroke
from PIL import Image

from siting.layers import CHANNEL_SIZES, SUPPLY_CLASSES

matplotlib.use("Agg")

PICTURE = Path(__file__).parent / "pictures" / "demo_map.png"
BEST = 5
NEAR_M = 230.0
INK, PAPER, OUTLINE = "#2b2622", "#ffffff", "#7a1f3d"
BOX = {"boxstyle": "square,pad=0.3", "facecolor": PAPER, "edgecolor": "none"}
HALO = [withStroke(linewidth=2.6, foreground=PAPER)]
SIZE_IN, DPI = (10.4, 7.6), 122
STEEPER, GREYS = 2.5, 40
CHANNEL_WIDTHS = (0.35, 0.7, 1.2, 2.0)


class Demo:
    """What a run of the demo wrote, and the outline that was given to it."""

    def __init__(self, folder: Path) -> None:
        package = folder / "results" / "siting.gpkg"
        self.plots, self.catchments, self.channels, self.villages, self.intakes, self.overflow = (
            gpd.read_file(package, layer=name)
            for name in ("plots", "catchments", "channels", "villages", "intakes", "overflow_paths")
        )
        self.boundary = gpd.read_file(folder / "boundary.geojson").to_crs(self.plots.crs)
        self.best = self.plots[self.plots["rank"] <= BEST].sort_values("rank")
        with rasterio.open(folder / "results" / "rasters" / "elevation_conditioned_m.tif") as file:
            self.height_m, self.bounds, self.cell_m = file.read(1), file.bounds, file.res[0]

    def of_best(self, layer: gpd.GeoDataFrame) -> gpd.GeoDataFrame:
        """Return what belongs to the best plots."""
        return layer[layer["plot_id"].isin(self.best["plot_id"])]


def draw(demo: Demo) -> Any:
    """Return the figure: the whole place, and the best plot from near."""
    pyplot.rcParams.update({"font.family": "DejaVu Sans", "font.size": 8, "text.color": INK})
    figure = pyplot.figure(figsize=SIZE_IN, dpi=DPI, facecolor=PAPER)
    whole, near = figure.add_axes((0.012, 0.016, 0.6, 0.91)), figure.add_axes((0.63, 0.526, 0.358, 0.4))
    figure.text(0.012, 0.948, "Low plots that could be cropped on run-on", fontsize=14, weight="bold")
    figure.text(0.988, 0.948, "INVENTED: ground, rain and villages", fontsize=11, weight="bold", ha="right", color=OUTLINE)
    west, south, east, north = demo.boundary.total_bounds
    _ground(whole, demo, ((west + east) / 2, (south + north) / 2), 0.535 * (north - south))
    _channels(whole, demo, CHANNEL_WIDTHS)
    _plots(whole, demo, 0.22)
    _best(whole, demo)
    demo.boundary.boundary.plot(ax=whole, color=INK, linewidth=1.4, linestyle=(0, (7, 2, 1.5, 2)), zorder=6)
    _villages(whole, demo)
    _scale_bar(whole, 1000, "1 km")
    _north(whole)
    _from_near(near, demo, whole)
    _legend(figure.add_axes((0.63, 0.016, 0.358, 0.485)))
    for axes in (whole, near):
        axes.set(xlabel="", ylabel="")
    return figure


def _ground(axes: Any, demo: Demo, middle: tuple[float, float], half_high_m: float) -> tuple[float, float, float, float]:
    """Shade the ground from the north-west, pale enough for everything else to stand out; return what is shown."""
    down, right = (STEEPER * part for part in np.gradient(demo.height_m, demo.cell_m))
    light = np.array([-1.0, 1.0, 1.4]) / np.sqrt(3.96)
    lit = (-right * light[0] + down * light[1] + light[2]) / np.sqrt(1.0 + right**2 + down**2)
    west, south, east, north = demo.bounds
    # few steps of grey keep the file small
    steps = np.round(GREYS * np.clip(lit, 0.0, 1.0)) / GREYS
    axes.imshow(
        steps, cmap="gray", vmin=-0.4, vmax=1.0, extent=(west, east, south, north), interpolation="bilinear", zorder=0
    )
    place = axes.get_window_extent()
    half_wide_m = half_high_m * place.width / place.height
    box = (middle[0] - half_wide_m, middle[1] - half_high_m, middle[0] + half_wide_m, middle[1] + half_high_m)
    axes.set(xlim=(box[0], box[2]), ylim=(box[1], box[3]), aspect="equal", autoscale_on=False, xticks=[], yticks=[])
    for side in axes.spines.values():
        side.set(color=INK, linewidth=0.8)
    return box


def _channels(axes: Any, demo: Demo, widths: tuple[float, ...]) -> None:
    lower = [float(value) for value in CHANNEL_SIZES.values]
    place = np.searchsorted(lower, demo.channels["contributing_area_m2"], side="right") - 1
    for number, size in enumerate(CHANNEL_SIZES.items):
        some = demo.channels[place == number]
        if len(some):
            some.plot(ax=axes, color=size.colour, linewidth=widths[number], zorder=2, capstyle="round")


def _plots(axes: Any, demo: Demo, width: float) -> None:
    lower = [float(value) for value in SUPPLY_CLASSES.values]
    place = np.searchsorted(lower, demo.plots["supply_ratio_dry"], side="right") - 1
    for number, step in enumerate(SUPPLY_CLASSES.items):
        some = demo.plots[place == number]
        if len(some):
            some.plot(ax=axes, facecolor=step.colour, edgecolor=INK, linewidth=width, zorder=4)


def _best(axes: Any, demo: Demo) -> None:
    """Outline the catchments of the best plots, and number them by rank."""
    demo.of_best(demo.catchments).plot(ax=axes, facecolor=OUTLINE, alpha=0.22, zorder=3)
    demo.of_best(demo.catchments).boundary.plot(ax=axes, color=OUTLINE, linewidth=1.1, zorder=5)
    for plot in demo.best.itertuples():
        middle = plot.geometry.representative_point()
        axes.annotate(
            str(plot.rank), (middle.x, middle.y), xytext=(15, 13), textcoords="offset points", ha="center", va="center",
            fontsize=9, weight="bold", color=PAPER, zorder=9,
            bbox={"boxstyle": "circle,pad=0.22", "facecolor": OUTLINE, "edgecolor": PAPER, "linewidth": 1.0},
            arrowprops={"arrowstyle": "-", "color": OUTLINE, "linewidth": 1.0, "shrinkB": 0},
        )  # fmt: skip


def _villages(axes: Any, demo: Demo) -> None:
    demo.villages.plot(ax=axes, marker="s", color=INK, edgecolor=PAPER, linewidth=0.9, markersize=30, zorder=8)
    for village in demo.villages.itertuples():
        axes.annotate(
            village.name, (village.geometry.x, village.geometry.y), xytext=(6, -2), textcoords="offset points", fontsize=8.5,
            style="italic", path_effects=HALO, zorder=8, va="top", annotation_clip=True,
        )  # fmt: skip


def _scale_bar(axes: Any, length_m: float, text: str) -> None:
    (west, east), (south, north) = axes.get_xlim(), axes.get_ylim()
    x, y, high = east - 0.03 * (east - west) - length_m, south + 0.025 * (north - south), 0.008 * (north - south)
    axes.add_patch(Rectangle((x, y), length_m / 2, high, facecolor=INK, edgecolor=INK, zorder=9))
    axes.add_patch(Rectangle((x + length_m / 2, y), length_m / 2, high, facecolor=PAPER, edgecolor=INK, zorder=9))
    axes.text(x + length_m / 2, y + 1.7 * high, text, ha="center", va="bottom", path_effects=HALO, zorder=9)


def _north(axes: Any) -> None:
    axes.annotate(
        "N", (0.95, 0.975), xytext=(0.95, 0.915), xycoords="axes fraction", textcoords="axes fraction", ha="center",
        va="center", fontsize=9, weight="bold", path_effects=HALO, arrowprops={"arrowstyle": "-|>", "facecolor": INK},
        zorder=9,
    )  # fmt: skip


def _from_near(axes: Any, demo: Demo, whole: Any) -> None:
    """Show the best plot: its catchment, where water enters, and where surplus goes."""
    first = demo.best.head(1)
    number = first["plot_id"].iloc[0]
    above, intake, surplus = (layer[layer["plot_id"] == number] for layer in (demo.catchments, demo.intakes, demo.overflow))
    middle = first.geometry.iloc[0].representative_point()
    box = _ground(axes, demo, (middle.x - 0.3 * NEAR_M, middle.y + 0.3 * NEAR_M), NEAR_M)
    _channels(axes, demo, tuple(2.2 * width for width in CHANNEL_WIDTHS))
    above.plot(ax=axes, facecolor=OUTLINE, alpha=0.2, zorder=3)
    above.boundary.plot(ax=axes, color=OUTLINE, linewidth=1.6, zorder=5)
    _plots(axes, demo, 0.7)
    surplus.plot(ax=axes, color=INK, linewidth=1.4, linestyle=(0, (3, 1.6)), zorder=6)
    intake.plot(ax=axes, marker="v", color=PAPER, edgecolor=INK, linewidth=1.0, markersize=46, zorder=7)
    _scale_bar(axes, 100, "100 m")
    one = first.iloc[0]
    text = f"Plot {number}, rank 1: {one['area_m2'] / 1e4:.2f} ha below {one['catchment_area_m2'] / 1e4:.1f} ha of catchment"
    axes.text(0.02, 0.97, text, transform=axes.transAxes, va="top", weight="bold", bbox=BOX, zorder=9)
    frame = Rectangle((box[0], box[1]), box[2] - box[0], box[3] - box[1], fill=False, edgecolor=INK, linewidth=1.0, zorder=7)
    whole.add_patch(frame)


def _legend(axes: Any) -> None:
    axes.axis("off")
    plots = [Patch(facecolor=step.colour, edgecolor=INK, linewidth=0.7, label=step.label) for step in SUPPLY_CLASSES.items]
    channels = [
        Line2D([], [], color=size.colour, linewidth=1.6 * width, label=size.label)
        for size, width in zip(CHANNEL_SIZES.items, CHANNEL_WIDTHS, strict=True)
    ]
    others = [
        Patch(facecolor="#e3d0d7", edgecolor=OUTLINE, label="catchments of 1 to 5"),
        Line2D([], [], color=INK, linewidth=1.4, linestyle=(0, (7, 2, 1.5, 2)), label="boundary"),
        Line2D([], [], color=INK, linewidth=1.4, linestyle=(0, (3, 1.6)), label="path of surplus water"),
        Line2D([], [], color=PAPER, marker="v", markeredgecolor=INK, markersize=7, linestyle="", label="intake"),
        Line2D([], [], color=INK, marker="s", markeredgecolor=PAPER, markersize=6, linestyle="", label="village"),
    ]
    _entries(
        axes,
        plots,
        "Plots: rain and usable run-on as a share of the crop's\nneed, in a dry year (four years in five bring more)",
        (0.0, 1.0),
    )
    _entries(axes, channels, "Channels, ground above", (0.0, 0.63))
    _entries(axes, others, "Others", (0.56, 0.63))
    note = "Numbers are ranks. Screened from maps: walk every place\nbefore you decide; ask who uses its land and water now."
    axes.text(0.0, 0.2, note, transform=axes.transAxes, va="top", fontsize=8, style="italic")


def _entries(axes: Any, handles: list[Any], title: str, at: tuple[float, float]) -> None:
    legend = axes.legend(
        handles=handles, title=title, loc="upper left", bbox_to_anchor=at, frameon=False, alignment="left", borderpad=0,
        borderaxespad=0, handlelength=1.8, labelspacing=0.55, title_fontproperties={"weight": "bold", "size": 8.5},
    )  # fmt: skip
    axes.add_artist(legend)


def save(figure: Any, path: Path) -> None:
    """Write the figure in its 256 commonest colours, so that the file stays small and flat colours stay true."""
    path.parent.mkdir(exist_ok=True)
    figure.canvas.draw()
    pixels = np.ascontiguousarray(np.asarray(figure.canvas.buffer_rgba())[:, :, :3])
    colours, counts = np.unique(pixels.reshape(-1, 3), axis=0, return_counts=True)
    commonest = colours[np.argsort(-counts, kind="stable")[:256]]
    palette = Image.new("P", (1, 1))
    palette.putpalette(commonest.ravel().tolist())
    Image.fromarray(pixels).quantize(palette=palette, dither=Image.Dither.NONE).save(path, optimize=True)


if __name__ == "__main__":
    save(draw(Demo(Path(sys.argv[1]))), PICTURE)
