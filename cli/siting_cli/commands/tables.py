"""The tables of published values, with their sources."""

import click

from siting_cli.console import show
from siting_cli.options import json_option


@click.command()
@json_option
def crops(as_json: bool) -> None:
    """List the crops: coefficients, stages, roots, yield response, sources."""
    from siting.tables import crops as all_crops

    show(
        [
            {
                "crop": row.name,
                "kc_ini_mid_end": row.kc,
                "stage_days": row.stage_days,
                "root_depth_m": row.root_depth_m,
                "depletion_fraction": row.depletion_fraction,
                "ky": row.ky,
                "ky_source": row.ky_source,
                "source": row.source,
            }
            for row in all_crops()
        ],
        as_json=as_json,
        footnotes=("ky_source", "source"),
    )


@click.command()
@json_option
def covers(as_json: bool) -> None:
    """List the covers: curve numbers by treatment, condition and soil group, sources."""
    from siting.tables import covers as all_covers

    rows: dict[tuple[str, str, str], dict[str, object]] = {}
    for row in all_covers():
        key = (row.cover, row.treatment, row.condition)
        new: dict[str, object] = {"cover": row.cover, "treatment": row.treatment or None, "condition": row.condition or None}
        entry = rows.setdefault(key, new | dict.fromkeys("ABCD") | {"source": row.source})
        entry[row.soil_group] = row.curve_number
    show(list(rows.values()), as_json=as_json, footnotes=("source",))


@click.command()
@json_option
def soils(as_json: bool) -> None:
    """List the soil textures: water, infiltration, soil group, sources."""
    from siting.tables import soils as all_soils

    show(
        [
            {
                "texture": row.texture,
                "field_capacity": row.field_capacity,
                "wilting_point": row.wilting_point,
                "available_mm_per_m": row.available_mm_per_m,
                "soil_group": row.soil_group,
                "infiltration_mm_h": row.infiltration_mm_h,
                "water_source": row.water_source,
                "infiltration_source": row.infiltration_source,
            }
            for row in all_soils()
        ],
        as_json=as_json,
        footnotes=("water_source", "infiltration_source"),
    )
