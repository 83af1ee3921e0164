"""What a run hands back to its caller."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from siting.layers.cautions import GENERAL_CAUTIONS, NO_EXCLUSIONS_CAUTION
from siting.layers.codes import WHY_NOT
from siting.notes import Assumption, Warned
from siting.pipeline.case import Case
from siting.pipeline.doubt import RankDoubt, told_swaps
from siting.pipeline.write import GEOPACKAGE, plain_table

SHOWN = (
    "plot_id",
    "rank",
    "rank_low",
    "rank_high",
    "supply_rank",
    "area_m2",
    "supported_area_m2",
    "x",
    "y",
    "yield_dry_m3",
    "storm_yield_m3",
    "crop_demand_m3",
    "supply_ratio_dry",
    "supply_ratio_median",
    "rain_only_ratio_dry",
    "reliability_pct",
    "reliability_low_pct",
    "reliability_high_pct",
    "rain_only_reliability_pct",
    "cautions",
)
"""What the summary tells of each plot."""


TOLD_FIRST = ("runoff.starts", "runoff.abstraction_ratio", "plots.efficiency")
"""Assumptions that every plot's run-on rests on, and the first of which people on the spot can confirm."""


@dataclass(frozen=True, slots=True)
class Results:
    """The summary of a run (plots by rank, cells by reason, assumptions, warnings, cautions) and its warnings."""

    summary: dict[str, Any]
    warnings: tuple[Warned, ...]


def summarise(frame: pd.DataFrame, case: Case, doubt: RankDoubt | None, folder_name: str) -> dict[str, Any]:
    """Sum up a run for a screen or a program; the seconds are added at its end."""
    counts = np.bincount(case.sites.plots.reason.ravel(), minlength=len(WHY_NOT.items))
    cautions = GENERAL_CAUTIONS if case.place.excluded is not None else (*GENERAL_CAUTIONS, NO_EXCLUSIONS_CAUTION)
    return {
        "plots": plain_table(frame, SHOWN),
        "n_plots": case.sites.plots.count,
        "swaps_by_supply": [] if doubt is None else told_swaps(doubt.swaps),
        "cells": {item.label: int(counts[int(item.value)]) for item in WHY_NOT.items},
        "assumptions": sorted(case.notes.assumptions, key=_importance),
        "warnings": [{"code": one.code, "text": one.text} for one in case.notes.warnings],
        "cautions_text": list(cautions),
        "folder": folder_name,
        "first_file": GEOPACKAGE,
    }


def _importance(assumption: Assumption) -> int:
    return TOLD_FIRST.index(assumption.id) if assumption.id in TOLD_FIRST else len(TOLD_FIRST)
