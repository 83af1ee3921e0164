"""What stands in where no figure for a soil is in print."""

import pytest

from siting.pipeline.soil import readily_evaporable_mm
from siting.tables import soil


def test_readily_evaporable_water_is_printed_or_that_of_the_nearest_texture() -> None:
    assert readily_evaporable_mm(soil("sandy loam"))[0] == pytest.approx(8.0)  # FAO-56 Table 19: 6 to 10 mm
    value, source = readily_evaporable_mm(soil("sandy clay loam"))
    assert 5.0 < value < 12.0
    assert source.startswith("assumption")
