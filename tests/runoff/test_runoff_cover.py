"""From maps of cover and soil group to curve numbers, and from those to classes."""

import numpy as np
import pytest

from siting import runoff
from siting.errors import ConfigError
from siting.notes import Notes
from siting.runoff.cover import note_low_curve_numbers

SHRUB = runoff.CoverClass("desert shrub", condition="poor")
RANGE = runoff.CoverClass("herbaceous range", condition="poor")
OWN = runoff.CoverClass("threshing floor", curve_number=95.0)
SEEN = runoff.CoverClass("desert shrub", condition="good", runs_after_mm=12.0)


def groups(*codes: int) -> np.ndarray:
    return np.array([codes], dtype=np.uint8)


def test_each_cell_takes_the_number_of_its_cover_and_group() -> None:
    # TR-55 (1986) Table 2-2d: desert shrub poor 63 77 85 88
    cover = np.array([[0, 0, 0, 0, 0, -1]])
    number, seen = runoff.curve_numbers(cover, [SHRUB], groups(1, 2, 3, 4, 0, 2), crusted=False, notes=Notes())
    np.testing.assert_array_equal(number, np.array([[63, 77, 85, 88, np.nan, np.nan]]))
    assert np.isnan(seen).all()


def test_a_crust_reads_the_table_two_letters_on() -> None:
    number, _ = runoff.curve_numbers(np.array([[0, 0, 0]]), [SHRUB], groups(1, 2, 4), crusted=True, notes=Notes())
    np.testing.assert_array_equal(number, np.array([[85, 88, 88]]))


def test_a_number_of_the_users_own_wins_and_needs_no_group() -> None:
    number, _ = runoff.curve_numbers(np.array([[0, 0]]), [OWN], groups(0, 1), crusted=False, notes=Notes())
    np.testing.assert_array_equal(number, np.array([[95, 95]]))


def test_every_number_read_from_the_table_is_noted_with_its_source() -> None:
    notes = Notes()
    runoff.curve_numbers(np.array([[0, 1]]), [SHRUB, RANGE], groups(1, 1), crusted=False, notes=notes)
    sources = {noted.id: noted.source for noted in notes.assumptions}
    assert "TR-55" in sources["curve_number.desert shrub, poor.A"]
    assert "Woodward" in sources["curve_number.herbaceous range, poor.A"]


def test_an_observed_threshold_follows_its_cover_into_the_classes() -> None:
    number, seen = runoff.curve_numbers(np.array([[0, 1]]), [SHRUB, SEEN], groups(2, 2), crusted=False, notes=Notes())
    classes = runoff.classify(curve_number=number, runs_after_mm=seen, valid=np.ones((1, 2), dtype=np.bool_))
    assert classes.label == ["runs after 12 mm", "CN 77"]
    np.testing.assert_array_equal(classes.class_of_cell, [[1, 0]])


def test_numbers_below_any_in_print_are_said() -> None:
    # TR-55 (1986) tables 2-2: the lowest printed is 30
    notes = Notes()
    note_low_curve_numbers(np.array([[1.0, 2.0, 30.0, np.nan]]), notes)
    assert [warned.code for warned in notes.warnings] == ["curve_number_low"]
    assert "50 % of the cells have a curve number below 30" in notes.warnings[0].text
    assert "the lowest is 1:" in notes.warnings[0].text
    notes = Notes()
    runoff.curve_numbers(np.array([[0, 0]]), [SHRUB], groups(1, 2), crusted=False, notes=notes)
    note_low_curve_numbers(np.array([[np.nan]]), notes)
    assert notes.warnings == []


def test_a_low_number_of_the_users_own_is_said() -> None:
    notes = Notes()
    low = runoff.CoverClass("sand sheet", curve_number=3.0)
    runoff.curve_numbers(np.array([[0, 1, 1, 1]]), [low, OWN], groups(1, 1, 1, 1), crusted=False, notes=notes)
    assert "25 % of the cells" in notes.warnings[0].text and "the lowest is 3:" in notes.warnings[0].text


def test_one_threshold_for_all_ground_needs_no_curve_number() -> None:
    classes = runoff.classify(
        curve_number=np.array([[77.0, np.nan]]), runs_after_mm=12.0, valid=np.ones((1, 2), dtype=np.bool_)
    )
    assert classes.label == ["runs after 12 mm"]
    assert classes.starts_at_mm(abstraction_ratio=0.05)[0] == pytest.approx(12.0)


@pytest.mark.parametrize("threshold", [0.0, -5.0, 5000.0])
def test_an_impossible_threshold_is_refused(threshold: float) -> None:
    with pytest.raises(ConfigError, match=r"runs_after_mm of .* mm is outside 0\.1 to 1000 mm"):
        runoff.classify(curve_number=np.array([[77.0]]), runs_after_mm=threshold, valid=np.array([[True]]))


@pytest.mark.parametrize("number", [-9999.0, 0.0, 101.0])
def test_an_impossible_curve_number_is_refused_unless_the_cell_is_out(number: float) -> None:
    cells = np.array([[77.0, number]])
    with pytest.raises(ConfigError, match="outside 0 to 100"):
        runoff.classify(curve_number=cells, runs_after_mm=None, valid=np.array([[True, True]]))
    classes = runoff.classify(curve_number=cells, runs_after_mm=None, valid=np.array([[True, False]]))
    np.testing.assert_array_equal(classes.class_of_cell, [[0, 65535]])


def test_a_soil_group_code_beyond_d_is_refused() -> None:
    with pytest.raises(ConfigError, match="soil group code 255 is unknown"):
        runoff.curve_numbers(np.array([[0]]), [SHRUB], groups(255), crusted=False, notes=Notes())
