"""All that is known of a place and its plots before their water is reckoned."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.config import Project
from siting.config.model import Settings
from siting.notes import Notes
from siting.pipeline.read import Place
from siting.pipeline.sites import Sites
from siting.pipeline.soil import SoilOfPlots
from siting.pipeline.surface import PlotGround
from siting.pipeline.weather import Weather
from siting.runoff import RunoffClasses
from siting.terrain import Terrain


@dataclass(frozen=True, slots=True, eq=False)
class Case:
    """
    A project, its place, ground, weather and plots; what later stages take from earlier ones.

    `own` is the ground of each plot, `soil` its soil, `curve_number` the mean one of its catchment, `cell_curve_number`
    that of each cell (NaN unknown); `weather` is None without a rain record.
    """

    project: Project
    notes: Notes
    threads: int
    place: Place
    weather: Weather | None
    ground: Terrain
    classes: RunoffClasses
    sites: Sites
    own: PlotGround
    soil: SoilOfPlots
    curve_number: npt.NDArray[np.float64]
    cell_curve_number: npt.NDArray[np.float32]

    @property
    def settings(self) -> Settings:
        """Return the settings of the run."""
        return self.project.settings
