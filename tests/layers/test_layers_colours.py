"""Colours are checked with published matrices, not by eye."""

import itertools

import numpy as np
import numpy.typing as npt
import pytest

from siting.layers.codes import (
    CAUTIONS,
    CHANNEL_SIZES,
    OPEN_CATCHMENT,
    PAN_STATUSES,
    POSITION_CODES,
    SUPPLY_CLASSES,
    VILLAGE_STATUSES,
    WHY_NOT,
)
from siting.layers.model import Classes
from siting.layers.rasters import RASTERS

# Machado, Oliveira & Fernandes 2009, IEEE TVCG 15(6), severity 1.0, on linear RGB; the matrices are from memory.
SEEN_BY = {
    "normal": np.eye(3),
    "protanopia": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]]
    ),
    "deuteranopia": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]]
    ),
    "tritanopia": np.array(
        [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]]
    ),
}
# sRGB to XYZ and the white of D65: IEC 61966-2-1; CIELAB: CIE 15 (both from memory)
XYZ = np.array([[0.4124564, 0.3575761, 0.1804375], [0.2126729, 0.7151522, 0.0721750], [0.0193339, 0.1191920, 0.9503041]])
WHITE = np.array([0.95047, 1.0, 1.08883])

DRAWN = [CHANNEL_SIZES, OPEN_CATCHMENT, PAN_STATUSES, POSITION_CODES, SUPPLY_CLASSES, VILLAGE_STATUSES, WHY_NOT]
ORDERED = [CHANNEL_SIZES, POSITION_CODES, SUPPLY_CLASSES]

Vector = npt.NDArray[np.float64]


def linear(colour: str) -> Vector:
    share = np.array([int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5)])
    return np.where(share <= 0.04045, share / 12.92, ((share + 0.055) / 1.055) ** 2.4)


def lab(colour: str, eye: str = "normal") -> Vector:
    ratio = XYZ @ np.clip(SEEN_BY[eye] @ linear(colour), 0, 1) / WHITE
    f = np.where(ratio > (6 / 29) ** 3, np.cbrt(ratio), ratio / (3 * (6 / 29) ** 2) + 4 / 29)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


def test_white_is_100_and_black_0_so_the_measure_itself_is_right() -> None:
    np.testing.assert_allclose(lab("#ffffff"), [100, 0, 0], atol=0.02)
    np.testing.assert_allclose(lab("#000000"), [0, 0, 0], atol=0.02)


@pytest.mark.parametrize("classes", DRAWN, ids=lambda item: item.name)
@pytest.mark.parametrize("eye", SEEN_BY)
def test_no_two_classes_look_alike_to_any_eye(classes: Classes, eye: str) -> None:
    # a difference of 5 is plain to see side by side (common practice)
    for one, other in itertools.combinations(classes.items, 2):
        assert np.linalg.norm(lab(one.colour, eye) - lab(other.colour, eye)) > 5, (one.value, other.value)


@pytest.mark.parametrize("classes", DRAWN, ids=lambda item: item.name)
def test_every_class_has_a_grey_of_its_own(classes: Classes) -> None:
    greys = sorted(float(lab(item.colour)[0]) for item in classes.items)
    assert min(np.diff(greys)) > 3


@pytest.mark.parametrize("classes", ORDERED, ids=lambda item: item.name)
def test_ordered_classes_darken_step_by_step(classes: Classes) -> None:
    assert np.all(np.diff([lab(item.colour)[0] for item in classes.items]) < -10)


@pytest.mark.parametrize("raster", [item for item in RASTERS if item.is_measure], ids=lambda item: item.name)
def test_measures_run_one_way_from_light_to_dark(raster: object) -> None:
    steps = np.diff([lab(item.colour)[0] for item in raster.style.items])  # type: ignore[attr-defined]
    assert np.all(steps > 10) or np.all(steps < -10)


def test_every_class_says_what_it_means_in_words() -> None:
    for classes in [*DRAWN, CAUTIONS]:
        assert len({item.label for item in classes.items}) == len(classes.items)
        assert all(item.sentence for item in classes.items)
