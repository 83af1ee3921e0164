"""Velocity that bare soil stands before flowing water cuts it, by texture class."""

from dataclasses import dataclass
from functools import cache

from siting.tables._rows import rows
from siting.tables.soils import soil


@dataclass(frozen=True, slots=True)
class PermissibleVelocity:
    """One texture class: the printed material that stands for it, and velocities of clear and of silty water, m/s."""

    texture: str
    material: str
    clear_water_m_s: float
    silty_water_m_s: float
    source: str
    confidence: str
    note: str


@cache
def permissible_velocity(texture: str) -> PermissibleVelocity:
    """
    Look up the greatest velocity that bare soil of a texture class stands; ConfigError for an unknown class.

    References
    ----------
    Fortier & Scobey (1926), Trans. ASCE 89; which of their materials stands for a texture class is our assumption.
    """
    name = soil(texture).texture
    row = next(row for row in rows("permissible_velocity") if row["texture_class"] == name)
    return PermissibleVelocity(
        name,
        row["material"],
        float(row["clear_water_m_s"]),
        float(row["silty_water_m_s"]),
        row["source"],
        row["confidence"],
        row["note"],
    )
