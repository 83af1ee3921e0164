"""The ratio that suffices in most seasons, with the reason where there is none."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import ranking
from siting.errors import ConfigError


def sufficient(
    needed: list[list[float]], lacks: list[list[bool]] | None = None, share: float = 0.8
) -> tuple[list[float], list[str]]:
    ratios = np.array(needed)
    lacking = np.zeros(ratios.shape, dtype=np.bool_) if lacks is None else np.array(lacks)
    got = ranking.sufficient_ratio(ratios, lacks_runon=lacking, share_of_seasons=share)
    return got.ratio.tolist(), got.reason.tolist()


def test_the_ratio_is_the_one_exceeded_in_the_other_seasons() -> None:
    # by hand: ten seasons, needed 1 to 10; 20 % exceed the value between ranks 2 (0.1585) and 3 (0.2561)
    ratio, reason = sufficient([[float(each) for each in range(1, 11)]])
    assert ratio[0] == pytest.approx(9 - (0.2 - 1.625 / 10.25) * 10.25)
    assert reason == [""]


def test_a_season_that_no_ratio_meets_counts_as_the_worst() -> None:
    needed = [[np.nan, *range(2, 11)]]  # ten seasons, one of them without run-on
    lacks = [[True] + [False] * 9]
    ratio, _ = sufficient(needed, lacks)
    worst, _ = sufficient([[1e9, *range(2, 11)]])
    assert ratio == worst
    left_out, _ = sufficient([list(range(2, 11))])
    assert ratio[0] > left_out[0]  # it never makes the plot look better


def test_no_ratio_has_its_reason() -> None:
    unknown = [np.nan] * 10
    endless = [np.nan] * 5 + [2.0] * 5
    few = [3.0] + [np.nan] * 9
    lacks = [[False] * 10, [True] * 5 + [False] * 5, [False] * 10]
    ratio, reason = sufficient([unknown, endless, few], lacks)
    assert np.isnan(ratio).all()
    assert reason == ["demand or run-on unknown", "no run-on in that season", "too few seasons"]


@given(
    st.lists(st.floats(0, 200), min_size=10, max_size=40),
    st.floats(0.2, 0.8),
)
def test_the_share_of_seasons_holds_on_the_record_itself(needed: list[float], share: float) -> None:
    ratio, _ = sufficient([needed], share=share)
    met = np.mean(np.array(needed) <= ratio[0] + 1e-9)
    assert met >= share - 1.0 / len(needed)  # a plotting position is not the plain share: within one season


@pytest.mark.parametrize(
    ("changed", "sentence"),
    [
        ({"rain_mm": 0.0}, "design rain 0 mm: it must be above 0"),
        ({"runoff_coefficient": 1.2}, "runoff coefficient 1.2: it must be above 0 and at most 1"),
        ({"efficiency": 65.0}, "efficiency 65"),
        ({"crop_mm": -1.0}, "crop water requirement -1 mm: it must be at least 0"),
    ],
)
def test_a_design_ratio_of_impossible_values_is_refused(changed: dict[str, float], sentence: str) -> None:
    values = {"crop_mm": 475.0, "rain_mm": 250.0, "runoff_coefficient": 0.25, "efficiency": 0.5}
    with pytest.raises(ConfigError, match=sentence):
        ranking.catchment_ratio(**(values | changed))


def test_an_unknown_coefficient_leaves_the_design_ratio_unknown() -> None:
    got = ranking.catchment_ratio(crop_mm=475, rain_mm=250, runoff_coefficient=[0.25, np.nan], efficiency=0.5)
    np.testing.assert_allclose(got, [7.2, np.nan])
