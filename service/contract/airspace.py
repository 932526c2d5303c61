"""Beams outdoors: how far they disturb pilots, beside the eye-hazard distance."""

from __future__ import annotations

from typing import cast

import numpy as np
from pydantic import Field

from service.assess.evaluate import Evaluation
from service.assess.interference import interference_m, visual_power_w
from service.contract.result import Known, Model
from service.files import DATA
from service.rules.airspace import airspace_tables

__all__ = ["REMINDER", "Airspace", "AirspaceZone", "airspace_of"]

REMINDER = (
    "The aviation authority decides whether and how a beam may enter the sky. Report the laser to it in good "
    "time; these distances only prepare that report."
)


class AirspaceZone(Model):
    """One zone and how far the beam exceeds its level."""

    zone: str
    name: str
    level_w_m2: float = Field(description="Visually corrected irradiance that must not be exceeded.")
    keeps_out: str
    extent: str
    distance_m: float | None = Field(description="The level is exceeded out to here; null: everywhere.")
    source: str
    known: Known
    note: str


class Airspace(Model):
    """Visual interference of a beam with pilots, beside the distance of the eye hazard."""

    luminous_efficiency: list[float] = Field(description="V of each line, 0 outside 360 to 820 nm.")
    visual_power_w: float = Field(description="Average power of all lines, each times its V.")
    zones: list[AirspaceZone]
    eye_hazard_distance_m: float | None
    source: str = Field(description="Where V is from.")
    reminder: str


def airspace_of(evaluation: Evaluation) -> Airspace:
    """Visual interference of one laser with pilots."""
    tables, lines = airspace_tables(DATA), evaluation.lines
    efficiency = tables.luminous_efficiency(lines.wavelength_nm)
    levels = np.array([zone.level_w_m2 for zone in tables.zones])
    reach = interference_m(lines, efficiency, levels)
    row = tables.photopic[0]
    far = float(evaluation.eye.far_m[0])
    return Airspace(
        luminous_efficiency=efficiency.tolist(),
        visual_power_w=float(visual_power_w(lines, efficiency).sum()),
        zones=[
            AirspaceZone(
                zone=zone.row,
                name=zone.name,
                level_w_m2=zone.level_w_m2,
                keeps_out=zone.keeps_out,
                extent=zone.extent,
                distance_m=float(z) if np.isfinite(z) else None,
                source=f"{tables.sources[zone.source].short}, {zone.locator}",
                known=cast(Known, zone.known),
                note=zone.note,
            )
            for zone, z in zip(tables.zones, reach.tolist(), strict=True)
        ],
        eye_hazard_distance_m=far if np.isfinite(far) else None,
        source=f"{tables.sources[row.source].short}, {row.locator} ({row.known})",
        reminder=REMINDER,
    )
