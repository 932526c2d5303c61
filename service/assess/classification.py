"""Hazard class of lasers: accessible emission against the limits of each class, for arrays."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from service.assess.criteria import TRAIN_RULE, Exposures, exposures
from service.assess.lines import Lines
from service.rules.classes import UNAIDED, ClassRule, CompiledScheme
from service.rules.limits import Conditions

__all__ = ["HOLDS", "UNAIDED", "ClassLimits", "Classification", "classify"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: An emission that equals the limit but for rounding still holds.
HOLDS = 1.0 + 1e-12


@dataclass(slots=True)
class ClassLimits:
    """Every criterion of one class's limits: 1-d arrays, one element per line, rule and row.

    `line` indexes the lines of the batch, `exposure` the `exposures`; `row` the limit rows;
    `limit` is the limit per pulse or over the time base [J or J/m2]. Per condition: the accessible
    `emission` in the same unit, its `ratio` to the limit and the measurement row used (that of the
    unaided condition where a band has no other).
    """

    exposures: Exposures
    exposure: Ints
    line: Ints
    row: NDArray[np.int16]
    limit: Floats
    emission: dict[str, Floats]
    ratio: dict[str, Floats]
    measured: dict[str, Ints]


@dataclass(slots=True)
class Classification:
    """Class of each laser, with what each class's limits say.

    `lines` have the wavelengths [nm] at which the scheme's tables were read. `number` indexes the
    scheme's classes. `available[limits]` per laser: a line lies where a class with these limits exists.
    `limits` by name of the limits; `ratio[limits][condition]`
    per laser: accessible emission over limit, lines added, lines for which these limits do not exist
    judged by the scheme's fallback.
    """

    scheme: CompiledScheme
    lines: Lines
    conditions: Conditions
    number: Ints
    available: dict[str, NDArray[np.bool_]]
    limits: dict[str, ClassLimits]
    ratio: dict[str, dict[str, Floats]]


def classify(lines: Lines, scheme: CompiledScheme) -> Classification:
    """The class of each laser of a batch under a scheme.

    Reference: IEC 60825-1:2014 clauses 4.3 and 5 (from memory), 21 CFR 1040.10(c), (d) (from memory).
    """
    lines = replace(lines, wavelength_nm=scheme.printed(lines.wavelength_nm))
    at = scheme.conditions(lines.wavelength_nm, lines.subtense_mrad)
    kind = scheme.adding.of("eye", lines.wavelength_nm) * 4
    limits: dict[str, ClassLimits] = {}
    worst: dict[str, dict[str, Floats]] = {}
    for target in scheme.targets:
        base = scheme.time_base(target, lines.wavelength_nm)
        covered = np.isfinite(base)
        timed = replace(lines, exposure_s=np.where(covered, base, 1.0))
        found = exposures(timed, at, scheme)
        cell = scheme.cells(at, found.line, found.time_s)
        rows = scheme.grid.rows(target, cell, (found.rule == TRAIN_RULE).astype(np.intp))
        e, slot = np.nonzero((rows >= 0) & covered[found.line][:, None])
        limits[target] = _against(lines, scheme, found, e, rows[e, slot], at)
    for target, table in limits.items():
        other = scheme.scheme.fallback.get(target)
        present = np.zeros(lines.count, dtype=bool)
        present[table.line] = True
        worst[target] = {}
        for condition in scheme.conditions_named:
            each = _per_line(table, condition, kind, scheme, lines.count)
            if other is not None:
                instead = _per_line(limits[other], condition, kind, scheme, lines.count)
                each = {
                    k: np.where(present, v, instead.get(k, np.zeros(lines.count))) for k, v in each.items()
                } | {k: np.where(present, 0.0, v) for k, v in instead.items() if k not in each}
            worst[target][condition] = _per_laser(each, lines)
    number = _choose(lines, scheme, worst)
    return Classification(scheme, lines, at, number, _available(lines, scheme, limits), limits, worst)


def _against(
    lines: Lines, scheme: CompiledScheme, found: Exposures, e: Ints, row: NDArray[np.int16], at: Conditions
) -> ClassLimits:
    """Limits and accessible emissions of the criteria `e` with their rows."""
    line = found.line[e]
    limit = scheme.values(row, at, line, found.time_s[e]) * found.share[e]
    wavelength, time = lines.wavelength_nm[line], found.aperture_s[e]
    beams = lines.beams.take(line)
    emission, ratio, measured = {}, {}, {}
    own = scheme.measured(UNAIDED, wavelength, time)
    for condition in scheme.conditions_named:
        aperture, distance, number = scheme.measured(condition, wavelength, time)
        none = number < 0
        aperture, distance = np.where(none, own[0], aperture), np.where(none, own[1], distance)
        through = found.dose[e] * beams.most_inside(aperture, distance)
        area = np.where(scheme.per_area[row], np.pi / 4.0 * aperture * aperture, 1.0)
        emission[condition] = through / area
        ratio[condition] = emission[condition] / limit
        measured[condition] = np.where(none, own[2], number)
    return ClassLimits(found, e, line, row, limit, emission, ratio, measured)


def _per_line(
    table: ClassLimits, condition: str, kind: Ints, scheme: CompiledScheme, count: int
) -> dict[int, Floats]:
    """Worst ratio of each line by additivity class (band and tissue)."""
    group = kind[table.line] + scheme.tissue[table.row]
    found = {}
    for name in np.unique(group):
        mine = group == name
        worst = np.zeros(count)
        np.maximum.at(worst, table.line[mine], table.ratio[condition][mine])
        found[int(name)] = worst
    return found


def _per_laser(each: dict[int, Floats], lines: Lines) -> Floats:
    """Lines of one class add; the worst class counts."""
    worst = np.zeros(lines.lasers)
    for ratios in each.values():
        worst = np.maximum(worst, np.bincount(lines.laser, ratios, lines.lasers))
    return worst


def _exists(rule: ClassRule, lines: Lines) -> NDArray[np.bool_]:
    """Whether a line of each laser lies in the wavelengths of a class."""
    if rule.wavelength_nm is None:
        return np.ones(lines.lasers, dtype=bool)
    low, high = rule.wavelength_nm
    inside = (lines.wavelength_nm >= low) & (lines.wavelength_nm < high)
    there: NDArray[np.bool_] = np.bincount(lines.laser, inside, lines.lasers) > 0
    return there


def _available(
    lines: Lines, scheme: CompiledScheme, limits: dict[str, ClassLimits]
) -> dict[str, NDArray[np.bool_]]:
    """Whether some class with these limits exists for each laser, and the limits for one of its lines."""
    found = {}
    for target, table in limits.items():
        rules = [rule for rule in scheme.scheme.classes if rule.limits == target]
        exists = np.any([_exists(rule, lines) for rule in rules], axis=0) if rules else True
        has_rows = np.bincount(lines.laser[table.line], minlength=lines.lasers) > 0
        found[target] = has_rows & exists
    return found


def _choose(lines: Lines, scheme: CompiledScheme, worst: dict[str, dict[str, Floats]]) -> Ints:
    """Number of the first class whose conditions hold; the last class always does."""
    number = np.full(lines.lasers, len(scheme.scheme.classes) - 1, dtype=np.intp)
    open_ = np.all([r <= HOLDS for r in worst[scheme.scheme.ceiling].values()], axis=0)
    for k, rule in enumerate(scheme.scheme.classes[:-1]):
        assert rule.limits is not None
        ratios = worst[rule.limits]
        if rule.aided_limits is None:
            holds = np.all([r <= HOLDS for r in ratios.values()], axis=0)
        else:
            aided = [worst[rule.aided_limits][c] <= HOLDS for c in ratios if c != UNAIDED]
            holds = np.all([ratios[UNAIDED] <= HOLDS, *aided], axis=0)
        holds &= _exists(rule, lines)
        number[open_ & holds] = k
        open_ &= ~holds
    return number
