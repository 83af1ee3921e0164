"""Published values come back as printed, and unknown names are refused with a way out."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import tables
from siting.errors import ConfigError
from siting.tables._rows import rows


@pytest.mark.parametrize(
    "name",
    [
        "curve_numbers",
        "antecedent_rain",
        "arc_conversion",
        "hsg_criteria",
        "crops",
        "crop_stages",
        "soils",
        "saxton_rawls_coefficients",
    ],
)
def test_every_row_of_every_table_names_its_source(name: str) -> None:
    table = rows(name)
    assert table
    assert all(row["source"].strip() for row in table)


# TR-55 (1986) Table 2-2d; NEH-630 Table 9-2
@pytest.mark.parametrize(
    ("cover", "condition", "numbers"),
    [
        ("herbaceous range", "poor", {"B": 80, "C": 87, "D": 93}),
        ("herbaceous range", "good", {"B": 62, "C": 74, "D": 85}),
        ("desert shrub", "poor", {"A": 63, "B": 77, "C": 85, "D": 88}),
        ("desert shrub", "fair", {"A": 55, "B": 72, "C": 81, "D": 86}),
        ("desert shrub", "good", {"A": 49, "B": 68, "C": 79, "D": 84}),
        ("sagebrush", "poor", {"B": 67, "C": 80, "D": 85}),
        ("pinyon-juniper", "good", {"B": 41, "C": 61, "D": 71}),
    ],
)
def test_range_curve_numbers_are_those_in_print(cover: str, condition: str, numbers: dict[str, float]) -> None:
    for group, expected in numbers.items():
        assert tables.curve_number(cover, condition=condition, soil_group=group).curve_number == expected


def test_bare_fallow_is_as_printed() -> None:
    # TR-55 (1986) Table 2-2b
    got = [tables.curve_number("fallow", treatment="bare soil", soil_group=group).curve_number for group in "ABCD"]
    assert got == [77, 86, 91, 94]


def test_a_missing_group_a_is_aligned_from_b_and_says_so() -> None:
    # Woodward et al. (2002): CN_B 80 -> 67.9
    row = tables.curve_number("herbaceous range", condition="poor", soil_group="A")
    assert row.curve_number == pytest.approx(67.9, abs=0.1)
    assert "Woodward" in row.source


def test_a_dual_group_counts_as_its_second_letter() -> None:
    dual = tables.curve_number("desert shrub", condition="poor", soil_group="B/D")
    assert dual.curve_number == 88


def test_an_unknown_cover_is_refused_with_near_names() -> None:
    with pytest.raises(ConfigError, match="did you mean 'desert shrub'"):
        tables.curve_number("desert shrubs", condition="poor", soil_group="B")


def test_a_cover_with_several_conditions_asks_for_one() -> None:
    with pytest.raises(ConfigError, match="needs a condition: poor, fair, good"):
        tables.curve_number("desert shrub", soil_group="B")


def test_a_crop_answers_to_its_first_word() -> None:
    # FAO-56 (1998) Tables 11, 12, 22; Ky of FAO-33
    sorghum = tables.crop("sorghum")
    assert sorghum.kc == (0.3, 1.05, 0.55)
    assert sorghum.stage_days == (20, 35, 45, 30)
    assert sorghum.root_depth_m == 2.0
    assert sorghum.depletion_fraction == 0.55
    assert sorghum.ky == 0.9


def test_a_crop_without_stages_or_yield_response_in_print_says_so() -> None:
    chickpea = tables.crop("chickpea")
    assert chickpea.stage_days is None
    assert "assumed" in chickpea.ky_source


def test_a_crop_of_several_kinds_asks_which_unless_one_is_the_grain() -> None:
    with pytest.raises(ConfigError, match=r"'wheat, spring', 'wheat, winter .*; name one"):
        tables.crop("wheat")
    assert tables.crop("wheat, winter").name == "wheat, winter (non-frozen soil)"
    assert tables.crop("sorghum").name == "sorghum, grain"


def test_an_unknown_crop_is_refused() -> None:
    with pytest.raises(ConfigError, match="crop 'sorgum' is not in the table; did you mean 'sorghum"):
        tables.crop("sorgum")


# USDA Soil Survey Manual chapter 3; Benham et al. (2009): points inside each class
@pytest.mark.parametrize(
    ("point", "name"),
    [
        ((90, 5, 5), "sand"),
        ((85, 5, 10), "loamy sand"),
        ((70, 15, 15), "sandy loam"),
        ((40, 40, 20), "loam"),
        ((20, 65, 15), "silt loam"),
        ((5, 84, 11), "silt"),
        ((60, 15, 25), "sandy clay loam"),
        ((30, 35, 35), "clay loam"),
    ],
)
def test_texture_points_fall_in_their_class(point: tuple[float, float, float], name: str) -> None:
    assert tables.texture_class(*point) == name


# the same source: the one class that the rules reach last is bounded too
@given(st.integers(0, 1000), st.integers(0, 1000), st.floats(-0.4, 0.4))
def test_clay_is_only_what_the_rules_call_clay(one: int, other: int, slack: float) -> None:
    low, high = sorted((one / 10, other / 10))
    sand, silt, clay = low, high - low, 100 - high
    # laboratory figures seldom sum to exactly 100
    silt = max(0.0, silt + slack)
    total = sand + silt + clay
    if tables.texture_class(sand, silt, clay) == "clay":
        assert 100 * clay / total > 39.999
        assert 100 * sand / total < 45.001
        assert 100 * silt / total < 40.001


def test_sizes_a_little_short_of_a_hundred_do_not_fall_between_the_classes() -> None:
    # scaled to 100 these are 45.2, 27.8, 27.0: sandy clay loam, and far from clay
    assert tables.texture_class(45.0, 27.7, 26.9) == "sandy clay loam"


def test_sizes_that_do_not_sum_to_a_hundred_are_refused() -> None:
    with pytest.raises(ConfigError, match="must sum to 100"):
        tables.texture_class(50, 20, 20)


# Saxton & Rawls (2006) Table 3: sand, clay, OM -> wilting point, field capacity, saturation (%v), Ks, density
@pytest.mark.parametrize(
    ("sand", "clay", "printed"),
    [
        (88, 5, (5, 10, 46, 108.1, 1.43)),
        (65, 10, (8, 18, 45, 50.3, 1.46)),
        (20, 15, (11, 31, 48, 16.1, 1.38)),
        (60, 25, (17, 27, 43, 11.3, 1.50)),
        (10, 45, (27, 41, 52, 3.7, 1.26)),
        (25, 50, (30, 42, 50, 1.1, 1.33)),
    ],
)
def test_soil_water_equals_the_printed_table(
    sand: float, clay: float, printed: tuple[float, float, float, float, float]
) -> None:
    got = tables.soil_water(sand, clay, 2.5)
    water = (100 * got.wilting_point, 100 * got.field_capacity, 100 * got.saturation)
    assert water == pytest.approx(printed[:3], abs=1.0)
    assert got.ksat_mm_h == pytest.approx(printed[3], rel=0.01, abs=0.06)
    assert got.density_g_cm3 == pytest.approx(printed[4], abs=0.01)


def test_fao_water_is_the_middle_of_the_printed_range() -> None:
    # FAO-56 (1998) Table 19: loam 0.20-0.30 and 0.07-0.17
    loam = tables.soil("loam")
    assert (loam.field_capacity, loam.wilting_point) == pytest.approx((0.25, 0.12))
    assert loam.available_mm_per_m == pytest.approx(130.0)
    assert loam.infiltration_mm_h == 12.5  # FAO AGL/MISC/17/91 section 2.3.7
    assert loam.soil_group == "B"  # TR-55 appendix A


# NEH-630 chapter 7, Table 7-1 (January 2009)
@pytest.mark.parametrize(
    ("layer", "water", "ksat", "group"),
    [
        (40, 200, 100, "D"),
        (80, 200, 41, "A"),
        (80, 200, 40, "B"),
        (80, 200, 5, "C"),
        (80, 200, 1, "D"),
        (150, 200, 10.1, "A"),
        (150, 200, 4.1, "B"),
        (150, 200, 0.5, "C"),
        (150, 200, 0.4, "D"),
        (150, 50, 12, "A/D"),
        (80, 50, 20, "B/D"),
        (150, 80, 20, "B"),
    ],
)
def test_soil_groups_follow_conductivity_and_depth(layer: float, water: float, ksat: float, group: str) -> None:
    assert tables.soil_group(layer_depth_cm=layer, water_table_cm=water, ksat_um_s=ksat) == group


def test_an_unknown_depth_gets_no_soil_group() -> None:
    with pytest.raises(ConfigError, match="must be a number"):
        tables.soil_group(layer_depth_cm=float("nan"), water_table_cm=100, ksat_um_s=1)


@pytest.mark.parametrize(
    ("sizes", "message"),
    [
        ((20.0, 65.0, 1.0), "clay is 65.0 %; the equations of soil water hold to 60 %"),
        ((95.0, 0.0, 0.0), "sand 95.0, clay 0.0, organic matter 0.0 % give no possible soil water"),
        ((40.0, 60.0, 8.0), "give no possible soil water"),
    ],
)
def test_soils_beyond_the_equations_are_refused(sizes: tuple[float, float, float], message: str) -> None:
    with pytest.raises(ConfigError, match=message):
        tables.soil_water(*sizes)


def test_readily_evaporable_water_is_that_of_the_nearest_printed_soil() -> None:
    # FAO-56 (1998) Table 19: loamy sand REW 4-8 of TEW 9-14 mm, clay REW 8-12 of TEW 22-29 mm
    assert tables.nearest_printed_rew_mm(11.0) == 6.0
    assert tables.nearest_printed_rew_mm(40.0) == 10.0
    assert tables.nearest_printed_rew_mm(2.0) == 2.0
    assert math.isnan(tables.nearest_printed_rew_mm(math.nan))
