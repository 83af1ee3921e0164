"""Classes of ground, losses on the way, and years."""

import numpy as np
import pytest

from siting import runoff
from siting.errors import InputError
from siting.notes import Notes


def one_class(number: float, threshold: float = np.nan) -> runoff.RunoffClasses:
    return runoff.RunoffClasses(np.zeros((1, 1), dtype=np.uint16), np.array([number]), np.array([threshold]))


def test_worked_storms_reach_the_plot_as_computed_by_hand() -> None:
    # a V-valley by hand: 48 000 m2 at CN 85, k 0.3 per km -> 45 750.21 m2; bed 400 m2, 25 mm
    storms = np.array([18.0, 30.0, 12.0])
    depth = runoff.class_runoff_mm(storms, one_class(85), abstraction_ratio=0.2)
    np.testing.assert_allclose(depth[0], [1.5158, 6.7187, 0.1925], atol=5e-5)
    got = runoff.delivered_m3(np.array([[45750.21]]), np.array([400.0]), depth, channel_wetting_mm=25.0)
    np.testing.assert_allclose(got[0], [59.3459, 297.3805, 0.0], rtol=1e-5)


def test_volume_of_one_event() -> None:
    # 12 ha, CN 77, 30 mm: 2.424 mm, 291 m3 (equation in mm)
    depth = runoff.class_runoff_mm(np.array([30.0]), one_class(77), abstraction_ratio=0.2)
    volume = runoff.delivered_m3(np.array([[120e3]]), np.zeros(1), depth, channel_wetting_mm=25.0)
    assert volume[0, 0] == pytest.approx(291, rel=0.005)


def test_runoff_by_class_differs_from_that_of_the_mean_curve_number() -> None:
    number = np.array([[60.0, 90.0]])
    classes = runoff.classify(curve_number=number, runs_after_mm=None, valid=np.ones((1, 2), dtype=np.bool_))
    by_class = runoff.class_runoff_mm(np.array([25.0]), classes, abstraction_ratio=0.2).mean()
    of_mean = runoff.class_runoff_mm(np.array([25.0]), one_class(75), abstraction_ratio=0.2)[0, 0]
    assert by_class > 3 * of_mean


def test_what_people_saw_wins_over_the_table() -> None:
    seen = one_class(60, 12.0)
    assert seen.starts_at_mm(abstraction_ratio=0.2)[0] == pytest.approx(12.0)
    assert seen.starts_at_mm(abstraction_ratio=0.05)[0] == pytest.approx(12.0)


def test_cells_of_unknown_cover_get_no_class() -> None:
    number = np.array([[80.0, np.nan, 80.0, 77.0]])
    valid = np.array([[True, True, False, True]])
    classes = runoff.classify(curve_number=number, runs_after_mm=None, valid=valid)
    np.testing.assert_array_equal(classes.class_of_cell, [[1, 65535, 65535, 0]])
    np.testing.assert_array_equal(classes.curve_number, [77.0, 80.0])


def record(first: str, days: int, rain: float = 1.0) -> runoff.Rain:
    start = np.datetime64(first, "D")
    return runoff.Rain(start + np.arange(days), np.full(days, rain))


def test_only_complete_years_are_kept_and_sums_are_exact() -> None:
    rain = record("2001-03-05", 3 * 365 + 100)
    years = runoff.hydrological_years(rain, starts_month=9, max_missing=0.05, notes=Notes())
    np.testing.assert_array_equal(years.labels, [2001, 2002])
    totals = runoff.yearly_totals(rain.rain_mm[None, :], rain.days, years)
    np.testing.assert_allclose(totals, [[365.0, 365.0]])


def test_a_year_with_a_gap_is_dropped_and_named() -> None:
    rain = record("2000-01-01", 366 + 365 + 365)
    rain.rain_mm[400:440] = np.nan
    notes = Notes()
    years = runoff.hydrological_years(rain, starts_month=1, max_missing=0.05, notes=notes)
    np.testing.assert_array_equal(years.labels, [2000, 2002])
    assert years.dropped == (2001,)
    assert any(warned.code == "years_dropped" and "2001" in warned.text for warned in notes.warnings)


def test_a_short_record_is_marked() -> None:
    notes = Notes()
    runoff.hydrological_years(record("2000-01-01", 800), starts_month=1, max_missing=0.05, notes=notes)
    assert [warned.code for warned in notes.warnings] == ["short_record"]


def test_a_record_without_a_complete_year_is_refused_with_a_way_out() -> None:
    with pytest.raises(InputError, match="holds no complete year that begins in month 1; give a longer"):
        runoff.hydrological_years(record("2000-02-01", 300), starts_month=1, max_missing=0.05, notes=Notes())


def test_the_year_begins_in_the_driest_month_unless_given() -> None:
    rain = record("2000-01-01", 3 * 366)
    rain.rain_mm[rain.days.astype("datetime64[M]").astype(int) % 12 == 6] = 0.0
    notes = Notes()
    years = runoff.hydrological_years(rain, starts_month=None, max_missing=0.05, notes=notes)
    assert years.starts_month == 7
    assert [assumption.id for assumption in notes.assumptions] == ["rain.year_starts"]


def test_days_that_are_not_consecutive_are_refused() -> None:
    days = np.array(["2000-01-01", "2000-01-03"], dtype="datetime64[D]")
    with pytest.raises(InputError, match="not consecutive"):
        runoff.Rain(days, np.zeros(2))
