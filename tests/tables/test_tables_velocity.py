"""Velocities that bare soil stands, against the printed figures."""

import pytest

from siting.errors import ConfigError
from siting.tables import TEXTURES, permissible_velocity


@pytest.mark.parametrize(
    ("texture", "feet_a_second"),
    [("sand", 1.5), ("sandy loam", 1.75), ("silt loam", 2.0), ("loam", 2.5), ("clay", 3.75)],
)
def test_clear_water_on_bare_soil_as_printed(texture: str, feet_a_second: float) -> None:
    """Fortier & Scobey (1926), as in Chow (1959) table 7-3: fine sand, sandy loam, silt loam, firm loam, stiff clay."""
    assert permissible_velocity(texture).clear_water_m_s == pytest.approx(0.3048 * feet_a_second, abs=0.001)


def test_every_texture_has_a_velocity_and_silt_in_the_water_helps() -> None:
    for texture in TEXTURES:
        found = permissible_velocity(texture)
        assert 0 < found.clear_water_m_s <= found.silty_water_m_s
        assert found.source and found.confidence and found.note
    with pytest.raises(ConfigError, match="did you mean"):
        permissible_velocity("lome")
