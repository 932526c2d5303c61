"""What the tables of a classification scheme must agree on; raises TableError where they do not."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import combinations, pairwise
from pathlib import Path
from typing import Any

from service.rules.class_scheme import (
    FIRST_NM,
    FIRST_S,
    LAST_NM,
    LAST_S,
    UNAIDED,
    ClassScheme,
    MeasurementRow,
)
from service.rules.limit_set import check_keys, numbers_ascend
from service.rules.tables import KNOWN, Source, TableError

__all__ = ["check_scheme", "check_source", "check_texts", "growth_bands"]

GrowthBand = tuple[float, float, float | None, float]


def check_texts(path: Path, name: str, texts: Iterable[Any]) -> None:
    """Refuse anything but texts that are not empty."""
    for text in texts:
        if not isinstance(text, str) or not text:
            raise TableError(path, 1, f"{name}: {text!r} is not a text")


def check_source(path: Path, name: str, entry: dict[str, Any], sources: dict[str, Source]) -> None:
    """Refuse a table of scheme.toml whose source or way of knowing is unknown."""
    check_texts(path, name, (entry["source"], entry["locator"], entry["known"]))
    if entry["source"] not in sources:
        raise TableError(path, 1, f"{name}: source {entry['source']!r} is not in sources.toml")
    if entry["known"] not in KNOWN:
        raise TableError(path, 1, f"{name}: known is {entry['known']!r}, expected one of {', '.join(KNOWN)}")


def growth_bands(path: Path, entries: Any) -> tuple[GrowthBand, ...]:
    """The bands (from [nm], to [nm], origin [nm] or None, per [nm s]) of a growth factor, ascending."""
    if not isinstance(entries, list) or not all(isinstance(entry, dict) for entry in entries):
        raise TableError(path, 1, "growth.band is not a list of tables")
    found: list[GrowthBand] = []
    for entry in entries:
        band = {"origin": None, **entry}
        check_keys(path, "growth.band", band, ("origin", "per", "wavelength_nm"))
        low, high = numbers_ascend(path, "growth.band.wavelength_nm", band["wavelength_nm"])
        per, origin = band["per"], band["origin"]
        if not _positive(per) or not (origin is None or _positive(origin)):
            raise TableError(path, 1, "growth.band: per and origin must be positive numbers")
        found.append((low, high, None if origin is None else float(origin), float(per)))
    if any(before[1] > after[0] for before, after in pairwise(found)):
        raise TableError(path, 1, "growth bands overlap or are out of order")
    return tuple(found)


def _positive(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool) and 0 < value < float("inf")


def check_scheme(scheme: ClassScheme) -> None:
    """Refuse a scheme whose classes, limits, time bases and measurement conditions do not fit together."""
    _check_classes(scheme)
    _check_time_bases(scheme)
    _check_measurement(scheme)
    _check_fallback(scheme)
    _check_repetition(scheme)


def _check_classes(scheme: ClassScheme) -> None:
    """Unique names; limits that have rows and a time base; none for the last class alone."""
    path, classes = scheme.path / "scheme.toml", scheme.classes
    targets = {row.target for row in scheme.limits}
    named = {c for rule in classes for c in (rule.limits, rule.aided_limits) if c} | {
        scheme.ceiling,
        *scheme.fallback.values(),
    }
    if not named <= targets or not targets <= {row.target for row in scheme.time_bases}:
        raise TableError(path, 1, "a class names limits that have no rows or no time base")
    if not classes or classes[-1].limits is not None or any(rule.limits is None for rule in classes[:-1]):
        raise TableError(path, 1, "the last class, and no other, has no limits")
    if len({rule.name for rule in classes}) != len(classes):
        raise TableError(path, 1, "two classes have one name")


def _whole(scheme: ClassScheme, target: str) -> bool:
    """Whether the limits of a target are declared for every wavelength and time."""
    covers = [c for c in scheme.coverage if c.target == target and c.tissue is None and c.effect is None]
    return any(
        c.wavelength_nm == (FIRST_NM, LAST_NM) and c.time_s == (FIRST_S, LAST_S) for c in covers
    ) or _joined(sorted(c.wavelength_nm for c in covers if c.time_s == (FIRST_S, LAST_S)), FIRST_NM, LAST_NM)


def _joined(bands: Iterable[tuple[float, float]], first: float, last: float) -> bool:
    """Whether ascending bands meet end to end from `first` to `last`."""
    bands = list(bands)
    ends = bool(bands) and bands[0][0] == first and bands[-1][1] == last
    return ends and all(before[1] == after[0] for before, after in pairwise(bands))


def _check_time_bases(scheme: ClassScheme) -> None:
    """The time bases of each target follow each other and reach over its whole coverage."""
    path = scheme.path / "timebases.csv"
    targets = {row.target for row in scheme.limits}
    for row in scheme.time_bases:
        if row.target not in targets:
            raise TableError(path, row.line, f"time base of {row.target!r}, which has no limits")
        if not 0.0 < row.duration_s <= LAST_S:
            raise TableError(
                path, row.line, f"the time base is {row.duration_s:g} s, expected up to {LAST_S:g} s"
            )
        if row.wavelength_to_nm <= row.wavelength_from_nm:
            raise TableError(path, row.line, f"row {row.row!r}: the band is empty")
    for target in sorted(targets):
        rows = sorted(
            (r for r in scheme.time_bases if r.target == target), key=lambda r: r.wavelength_from_nm
        )
        for before, after in pairwise(rows):
            if before.wavelength_to_nm != after.wavelength_from_nm:
                raise TableError(
                    path, after.line, f"time bases of {target}: gap or overlap before {after.row!r}"
                )
        for cover in (c for c in scheme.coverage if c.target == target):
            low, high = cover.wavelength_nm
            if low < rows[0].wavelength_from_nm or high > rows[-1].wavelength_to_nm:
                raise TableError(
                    path, rows[0].line, f"gap: no time base for {target} over {low:g} to {high:g} nm"
                )


def _check_measurement(scheme: ClassScheme) -> None:
    """Every condition fills its wavelengths at all times, once; the unaided one fills them all."""
    path = scheme.path / "measurement.csv"
    conditions: dict[str, list[MeasurementRow]] = {UNAIDED: []}
    for row in scheme.measurement:
        if row.coefficient_mm <= 0.0 or row.distance_m < 0.0:
            raise TableError(path, row.line, f"row {row.row!r}: aperture not positive or distance negative")
        if row.wavelength_to_nm <= row.wavelength_from_nm or row.time_to_s <= row.time_from_s:
            raise TableError(path, row.line, f"row {row.row!r}: the band is empty")
        conditions.setdefault(row.condition, []).append(row)
    for condition, rows in conditions.items():
        if not rows:
            raise TableError(path, 1, f"condition {condition!r}, without optics, is missing")
        for one, other in combinations(rows, 2):
            apart = (
                one.wavelength_to_nm <= other.wavelength_from_nm
                or other.wavelength_to_nm <= one.wavelength_from_nm
                or one.time_to_s <= other.time_from_s
                or other.time_to_s <= one.time_from_s
            )
            if not apart:
                raise TableError(path, other.line, f"row {other.row!r} overlaps row {one.row!r}")
        edges = sorted({w for r in rows for w in (r.wavelength_from_nm, r.wavelength_to_nm)})
        if condition == UNAIDED and (edges[0], edges[-1]) != (FIRST_NM, LAST_NM):
            raise TableError(path, rows[0].line, f"gap: condition {condition} leaves out wavelengths")
        for low, high in pairwise(edges):
            here = [r for r in rows if r.wavelength_from_nm <= low and high <= r.wavelength_to_nm]
            if not _joined(sorted((r.time_from_s, r.time_to_s) for r in here), FIRST_S, LAST_S):
                text = f"gap: condition {condition} leaves out times from {low:g} to {high:g} nm"
                raise TableError(path, rows[0].line, text)


def _check_fallback(scheme: ClassScheme) -> None:
    """Limits that end somewhere fall back on limits that hold everywhere."""
    path = scheme.path / "scheme.toml"
    targets = {row.target for row in scheme.limits}
    for target, other in scheme.fallback.items():
        if target not in targets:
            raise TableError(path, 1, f"fallback of {target!r}, which has no limits")
        if not _whole(scheme, other):
            raise TableError(path, 1, f"{target} falls back on {other}, which does not hold everywhere")
    for target in sorted(targets - set(scheme.fallback)):
        if not _whole(scheme, target):
            raise TableError(
                path, 1, f"the limits of {target} do not hold everywhere and fall back on nothing"
            )


def _check_repetition(scheme: ClassScheme) -> None:
    """The repetition rows of all classes are the same: the engine takes the first that holds."""
    groups: dict[str, list[tuple[Any, ...]]] = {}
    lines: dict[str, int] = {}
    for row in scheme.repetition:
        lines.setdefault(row.target, row.line)
        groups.setdefault(row.target, []).append((
            row.tissue, row.effect, row.pulse, row.exposure_from_s, row.exposure_to_s, row.subtense_from_mrad,
            row.subtense_to_mrad, row.count_from, row.count_to, row.coefficient, row.count_power, row.floor,
        ))  # fmt: skip
    (first, wanted), *others = groups.items()
    for target, rows in others:
        if rows != wanted:
            path = scheme.path / "repetition.csv"
            raise TableError(
                path, lines[target], f"the repetition rows of {target} differ from those of {first}"
            )
