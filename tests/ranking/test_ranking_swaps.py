"""What would swap neighbours in rank: every change run again, and no smaller one found."""

from dataclasses import replace

import numpy as np
import pytest

from siting import ranking
from siting.errors import ConfigError
from siting.ranking import Inputs, Spread, SupplyModel
from tests.ranking.doubt_case import NO_SPREAD, made_case, plain_rank


def changed(model: SupplyModel, name: str, group: int, change: float) -> Inputs:
    """Change one input as a reader of the table of swaps would."""
    start = model.in_use
    codes = model.cover_class if name == "cover_curve_number" else model.soil_class
    at = codes == group
    return {
        "curve_number": lambda: replace(start, region_shift=change),
        "cover_curve_number": lambda: replace(start, cover_shift=change * at),
        "abstraction_ratio": lambda: replace(start, abstraction_ratio=round(0.2 + change, 2)),
        "conveyance_loss_per_km": lambda: replace(start, loss_per_km=0.3 + change),
        "channel_wetting_mm": lambda: replace(start, channel_wetting_mm=25.0 + change),
        "reference_et": lambda: replace(start, et0_factor=1.0 + change / 100.0),
        "available_water": lambda: replace(start, available_water_factor=1.0 + change / 100.0 * at),
        "infiltration": lambda: replace(start, infiltration_factor=1.0 + change / 100.0 * at),
    }[name]()


def test_swaps_of_neighbours_hold_when_run_again_and_no_smaller_change_does() -> None:
    case = made_case(60, seed=9)
    model = case.model()
    swaps = ranking.neighbour_swaps(model, Spread())
    rank = plain_rank(case, model.in_use)
    np.testing.assert_array_equal(rank[swaps.upper_id - 1], np.arange(1, 60))
    np.testing.assert_array_equal(rank[swaps.lower_id - 1], np.arange(2, 61))
    found = np.flatnonzero(swaps.change_sd > 0)
    assert found.size > 50 and len(set(swaps.input[found])) >= 4
    for pair in found:
        upper, lower = swaps.upper_id[pair] - 1, swaps.lower_id[pair] - 1
        name, group, change = str(swaps.input[pair]), int(swaps.group[pair]), float(swaps.change[pair])
        after = plain_rank(case, changed(model, name, group, change))
        assert after[lower] < after[upper], (pair, name, change)
        if name != "abstraction_ratio":
            before = plain_rank(case, changed(model, name, group, 0.99 * change))
            assert before[lower] > before[upper], (pair, name, change)


def test_no_other_input_swaps_a_pair_by_a_smaller_change() -> None:
    case = made_case(60, seed=9)
    model = case.model()
    swaps = ranking.neighbour_swaps(model, Spread(), pairs=12)
    assert swaps.upper_id.size == 12
    # in the units of the table; of even draws on a plain scale by the formula, on a log scale from many of them
    log_sd = {ends: float(np.std(np.geomspace(*ends, 200_001))) for ends in ((0.1, 0.8), (12.5, 50.0), (30.0, 150.0))}
    sds = [("curve_number", -1, 4.0), ("conveyance_loss_per_km", -1, log_sd[0.1, 0.8])]
    sds += [("channel_wetting_mm", -1, log_sd[12.5, 50.0]), ("reference_et", -1, 20.0 / np.sqrt(12.0))]
    sds += [("cover_curve_number", int(code), 3.0) for code in model.cover_class]
    sds += [("available_water", int(code), 40.0 / np.sqrt(12.0)) for code in model.soil_class]
    sds += [("infiltration", int(code), log_sd[30.0, 150.0]) for code in model.soil_class]
    for upper, lower, name, group, change, change_sd in zip(
        swaps.upper_id, swaps.lower_id, swaps.input, swaps.group, swaps.change, swaps.change_sd, strict=True
    ):
        if name in ("", "abstraction_ratio"):
            continue
        own_sd = next(sd for other, code, sd in sds if (other, code) == (name, group))
        assert abs(change) / own_sd == pytest.approx(change_sd, rel=1e-3)
        for other, code, sd in sds:
            for share in (-0.97, -0.5, 0.5, 0.97):
                keys = model.keys(changed(model, other, code, share * change_sd * sd), np.array([upper, lower]) - 1)
                assert tuple(keys[:, 0]) > tuple(keys[:, 1]), (upper, lower, other, share)


def test_equal_neighbours_tie_and_some_pairs_never_swap() -> None:
    # the first two are equal; the third has the same ground but less of it: no one input brings it up
    case = made_case(1).take([0, 0, 0])
    area = case.area_m2 * np.array([[1.0], [1.0], [0.5]])
    swaps = ranking.neighbour_swaps(replace(case, area_m2=area, bed_m2=np.zeros(3)).model(), Spread())
    assert list(zip(swaps.upper_id, swaps.lower_id, strict=True)) == [(1, 2), (2, 3)]
    assert list(swaps.input) == ["tie", ""]
    assert swaps.change_sd[0] == 0.0 and np.isnan(swaps.change_sd[1]) and np.isnan(swaps.change[1])
    one = ranking.neighbour_swaps(made_case(1).model(), Spread())
    assert one.upper_id.size == one.input.size == 0


def test_an_input_without_spread_swaps_nothing() -> None:
    swaps = ranking.neighbour_swaps(made_case().model(), NO_SPREAD)
    assert set(swaps.input) == {""}
    ratio_alone = ranking.neighbour_swaps(made_case().model(), replace(NO_SPREAD, abstraction_ratios=(0.2, 0.05)))
    assert set(ratio_alone.input) == {"", "abstraction_ratio"}
    moved = ratio_alone.input == "abstraction_ratio"
    np.testing.assert_allclose(ratio_alone.change[moved], -0.15)
    np.testing.assert_allclose(ratio_alone.change_sd[moved], 2.0)  # two values, equally likely: sd is half their distance


def test_pairs_are_at_least_one() -> None:
    with pytest.raises(ConfigError, match="0 pairs of neighbours: give at least 1"):
        ranking.neighbour_swaps(made_case().model(), Spread(), pairs=0)
