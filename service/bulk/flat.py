"""Lasers of one line as flat rows, and results as flat columns: the names of CSV files and data frames."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from service.contract.classification import schemes
from service.rules.ruleset import TARGETS

__all__ = [
    "COLUMNS",
    "NUMBERS",
    "WORST",
    "UnknownColumn",
    "absent",
    "check_columns",
    "class_column",
    "flat_record",
    "nested",
    "problem_text",
    "result_columns",
]

TEXTS = ("label", "rules", "mode", "profile", "level", "diameter_at")
NUMBERS = (
    "exposure_s",
    "wavelength_nm",
    "subtense_mrad",
    "power_w",
    "energy_j",
    "pulse_s",
    "rate_hz",
    "average_power_w",
    "diameter_mm",
    "diameter_y_mm",
    "divergence_mrad",
    "divergence_y_mrad",
    "waist_m",
    "distance_m",
    "visibility_km",
    "mode_field_diameter_um",
    "numerical_aperture",
    "core_diameter_um",
    "output_mirror_reflectance",
)
#: Columns of a laser. A cell that is empty (a number that is NaN) is a field that is not given.
COLUMNS = TEXTS + NUMBERS
TOP = ("label", "rules", "exposure_s")
EMISSION = ("mode", "power_w", "energy_j", "pulse_s", "rate_hz", "average_power_w")
BEAM = (
    *("profile", "level", "diameter_at", "waist_m"),
    *("mode_field_diameter_um", "numerical_aperture", "core_diameter_um"),
)
LINE = ("wavelength_nm", "subtense_mrad", "output_mirror_reflectance")
VIEWING = ("distance_m", "visibility_km")
PAIRS = ("diameter_mm", "divergence_mrad")


class UnknownColumn(ValueError):
    """A column that no field has, or one that stands twice; nothing is ignored silently."""


def absent(cell: Any) -> bool:
    """Whether a cell is empty: None, empty text, NaN, or a data frame's mark for a missing value."""
    if cell is None or isinstance(cell, str):
        return not cell
    try:
        return bool(cell != cell)
    except TypeError:
        return True


def check_columns(names: list[str]) -> None:
    """Raises UnknownColumn for a name that no field has and for one that stands twice."""
    unknown = [n for n in names if n not in COLUMNS]
    if unknown:
        raise UnknownColumn(f"unknown column {unknown[0]!r}; there are {', '.join(COLUMNS)}")
    twice = [n for k, n in enumerate(names) if n in names[:k]]
    if twice:
        raise UnknownColumn(f"column {twice[0]!r} stands twice")


def nested(row: Mapping[str, Any]) -> dict[str, Any]:
    """The request of a flat row of cells that are given: numbers or text by column."""
    given = dict(row)
    line: dict[str, Any] = {k: given[k] for k in LINE if k in given}
    line["emission"] = {k: given[k] for k in EMISSION if k in given}
    beam = line["beam"] = {k: given[k] for k in BEAM if k in given}
    for name in PAIRS:
        y = name.replace("_m", "_y_m")
        if y in given:
            beam[name] = [given.get(name), given[y]]
        elif name in given:
            beam[name] = given[name]
    top: dict[str, Any] = {k: given[k] for k in TOP if k in given}
    if viewing := {k: given[k] for k in VIEWING if k in given}:
        top["viewing"] = viewing
    return {**top, "lines": [line]}


def class_column(scheme: str) -> str:
    """Name of the column with the class under a scheme."""
    return f"class_{scheme.replace('-', '_')}"


#: Result columns of each target.
OF_TARGET = (
    "hazard_distance_m",
    "hazard_from_m",
    "hazard_ratio",
    "optical_density",
    "line",
    "rule",
    "tissue",
    "effect",
    "row",
    "ratio_at_distance",
    "density_at_distance",
)


#: The worst case of a row: with an optical aid where one was entered, and as if a sweep stopped.
WORST = ("worst_eye_hazard_distance_m", "worst_skin_hazard_distance_m", "worst_optical_density")


def result_columns() -> list[str]:
    """Names of the columns of results, in their order."""
    return [
        "label",
        "rules",
        "rules_digest",
        *(f"{target}_{name}" for target in TARGETS for name in OF_TARGET),
        *WORST,
        *(class_column(scheme) for scheme in schemes()),
        "notices",
        "problem",
    ]


def flat_record(record: Mapping[str, Any]) -> dict[str, Any]:
    """A summary or problem record as a flat row; an unbounded distance is infinite."""
    if "problem" in record:
        return {"problem": problem_text(record["problem"])}
    flat: dict[str, Any] = {name: record[name] for name in ("label", "rules", "rules_digest")}
    for target in TARGETS:
        found = record[target]
        far, zone = found["hazard_distance_m"], found["hazard_zone_m"]
        flat[f"{target}_hazard_distance_m"] = math.inf if far is None else far
        flat[f"{target}_hazard_from_m"] = 0.0 if zone is None else zone[0]
        for name in ("hazard_ratio", "optical_density"):
            flat[f"{target}_{name}"] = found[name]
        flat |= {f"{target}_{name}": value for name, value in found["governing"].items()}
        if (there := found["at_distance"]) is not None:
            flat[f"{target}_ratio_at_distance"] = there["hazard_ratio"]
            flat[f"{target}_density_at_distance"] = there["optical_density"]
    flat |= dict(zip(WORST, _worst(record), strict=True))
    flat |= {class_column(scheme): name for scheme, name in record["classes"].items()}
    flat["notices"] = " ".join(record["notices"])
    flat["problem"] = ""
    return flat


def _worst(record: Mapping[str, Any]) -> tuple[float, float, float]:
    """Longest distances [m] of eye and skin, highest density: of aided eyes and stopped sweeps too."""
    stopped = record["stopped"] or {}
    eyes = [record["eye"], record["eye_aided"], stopped.get("eye"), stopped.get("eye_aided")]
    return (
        _longest(eyes),
        _longest([record["skin"], stopped.get("skin")]),
        max(case["optical_density"] for case in eyes if case is not None),
    )


def _longest(cases: list[Mapping[str, Any] | None]) -> float:
    """The longest of hazard distances [m]; infinite where one has no end."""
    ends = [case["hazard_distance_m"] for case in cases if case is not None]
    return math.inf if None in ends else float(max(ends))


def problem_text(document: Mapping[str, Any]) -> str:
    """A problem document in one line: what is wrong, what is allowed, what to do."""
    errors = document["errors"]
    if not errors:
        return str(document["detail"])
    return f"{document['detail']}; allowed: {errors[0]['allowed']}. {errors[0]['remedy']}"
