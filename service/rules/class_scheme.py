"""What a classification scheme consists of, as read from its folder."""

from __future__ import annotations

from dataclasses import dataclass

from service.rules.limit_set import LimitSet
from service.rules.tables import Row

__all__ = [
    "BAND_ENDS",
    "FIRST_NM",
    "FIRST_S",
    "LAST_NM",
    "LAST_S",
    "UNAIDED",
    "ClassRule",
    "ClassScheme",
    "MeasurementRow",
    "TimeBaseRow",
]

#: Ends of every table: wavelength [nm], time [s].
FIRST_NM, LAST_NM = 180.0, 1e6
FIRST_S, LAST_S = 1e-13, 3e4
#: Name of the condition without optics in the measurement tables.
UNAIDED = "3"
#: Which end of a printed wavelength band belongs to it.
BAND_ENDS = ("lower", "upper")


@dataclass(frozen=True, slots=True)
class MeasurementRow(Row):
    """One measurement condition: aperture coefficient_mm x t^time_power [mm] at distance_m."""

    condition: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    time_from_s: float
    time_to_s: float
    coefficient_mm: float
    time_power: float
    distance_m: float


@dataclass(frozen=True, slots=True)
class TimeBaseRow(Row):
    """Time base [s] of the limits of one class in a wavelength band."""

    target: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    duration_s: float


@dataclass(frozen=True, slots=True)
class ClassRule:
    """When a class holds.

    `limits` names the limits that must not be exceeded; under every condition, or, where
    `aided_limits` is given, under the unaided condition alone while the aided one stays below
    `aided_limits`. `wavelength_nm`: a line must lie in this band for the class to be available.
    The last class has no limits.
    """

    name: str
    limits: str | None
    aided_limits: str | None
    wavelength_nm: tuple[float, float] | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ClassScheme(LimitSet):
    """A published scheme of hazard classes.

    `fallback` gives the limits used where a class has none; no class but the last may exceed the
    limits named by `ceiling`. `band_ends` tells which end of a printed wavelength band belongs to it.
    """

    ceiling: str
    band_ends: str
    classes: tuple[ClassRule, ...]
    fallback: dict[str, str]
    measurement: tuple[MeasurementRow, ...]
    time_bases: tuple[TimeBaseRow, ...]
    remarks: tuple[str, ...]
