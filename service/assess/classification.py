"""Hazard class of lasers: accessible emission against the limits of each class, for arrays."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from service.assess.criteria import TRAIN_RULE, Exposures, exposures
from service.assess.lines import Lines
from service.optics.beams import Beams
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

    def of(self, which: slice) -> ClassLimits:
        """The criteria at `which`."""
        columns = (getattr(self, name)[which] for name in ("exposure", "line", "row", "limit"))
        named = (
            {condition: values[which] for condition, values in table.items()}
            for table in (self.emission, self.ratio, self.measured)
        )
        return ClassLimits(self.exposures, *columns, *named)


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
    every, target = _criteria(lines, scheme, at)
    # The criteria stand target by target.
    ends = np.searchsorted(target, np.arange(len(scheme.targets) + 1)).tolist()
    limits = {name: every.of(slice(*ends[n : n + 2])) for n, name in enumerate(scheme.targets)}
    worst = _per_laser(every, target, lines, scheme)
    exists = [_exists(rule, lines) for rule in scheme.scheme.classes]
    number = _choose(lines, scheme, worst, exists)
    return Classification(scheme, lines, at, number, _available(lines, scheme, limits, exists), limits, worst)


def _criteria(lines: Lines, scheme: CompiledScheme, at: Conditions) -> tuple[ClassLimits, Ints]:
    """Limits and accessible emissions of every line by the limits of every class, in one pass.

    Also the number of the limits (in `scheme.targets`) of each criterion, ascending.
    """
    base = np.stack([scheme.time_base(target, lines.wavelength_nm) for target in scheme.targets])
    target, line = np.nonzero(np.isfinite(base))
    timed = lines.take(line, base[target, line])
    at = at.take(line)
    found = exposures(timed, at, scheme)
    cell = scheme.cells(at, found.line, found.time_s)
    of_target = target[found.line]
    rows = scheme.rows(of_target, cell, (found.rule == TRAIN_RULE).astype(np.intp))
    e, slot = np.nonzero(rows >= 0)
    row, case = rows[e, slot], found.line[e]
    limit = scheme.values(row, at, case, found.time_s[e]) * found.share[e]
    return _against(lines, scheme, found, e, row, line[case], limit), of_target[e]


def _against(
    lines: Lines,
    scheme: CompiledScheme,
    found: Exposures,
    e: Ints,
    row: NDArray[np.int16],
    line: Ints,
    limit: Floats,
) -> ClassLimits:
    """Accessible emissions of the criteria `e` under every condition, against their limits."""
    wavelength, time = lines.wavelength_nm[line], found.aperture_s[e]
    own = scheme.measured(UNAIDED, wavelength, time)
    names, apertures, distances, numbers = scheme.conditions_named, [], [], []
    for condition in names:
        aperture, distance, number = scheme.measured(condition, wavelength, time)
        none = number < 0
        apertures.append(np.where(none, own[0], aperture))
        distances.append(np.where(none, own[1], distance))
        numbers.append(np.where(none, own[2], number))
    aperture, distance = np.concatenate(apertures), np.concatenate(distances)
    fraction = _fractions(lines.beams, np.tile(line, len(names)), aperture, distance)
    area = np.where(np.tile(scheme.per_area[row], len(names)), np.pi / 4.0 * aperture * aperture, 1.0)
    emission = (np.tile(found.dose[e], len(names)) * fraction / area).reshape(len(names), -1)
    ratio = emission / limit
    by_name = (dict(zip(names, values, strict=True)) for values in (emission, ratio, numbers))
    return ClassLimits(found, e, line, row, limit, *by_name)


def _fractions(beams: Beams, line: Ints, aperture_m: Floats, distance_m: Floats) -> Floats:
    """Most of each line's beam inside an aperture [m] at a distance [m] or beyond it.

    Limits share apertures and distances: each beam that is not round, whose fraction takes an integral, is
    asked for each of them once.
    """
    same = [x == y for x, y in zip(*beams.axes(), strict=True)]
    asked = again = np.arange(len(line))
    uneven = np.flatnonzero(~np.logical_and.reduce(same)[line])
    if uneven.size:
        order = uneven[np.lexsort((aperture_m[uneven], distance_m[uneven], line[uneven]))]
        key = np.stack([line[order], distance_m[order], aperture_m[order]])
        new = np.r_[True, (key[:, 1:] != key[:, :-1]).any(axis=0)]
        again = again.copy()
        again[order] = order[new][np.cumsum(new) - 1]
        asked = np.flatnonzero(again == asked)
    fraction = np.empty(len(line))
    fraction[asked] = beams.take(line[asked]).most_inside(aperture_m[asked], distance_m[asked])
    return fraction[again]


def _per_laser(
    every: ClassLimits, target: Ints, lines: Lines, scheme: CompiledScheme
) -> dict[str, dict[str, Floats]]:
    """Worst ratio of each laser by limits and condition.

    Each line enters an additivity class (band and tissue) with its worst criterion, the lines of one class
    add, the worst class counts. A line for which limits do not exist is judged by those they fall back on.
    """
    kind = scheme.adding.of("eye", lines.wavelength_nm) * 4
    names, group = np.unique(kind[every.line] + scheme.tissue[every.row], return_inverse=True)
    shape = (len(scheme.targets), len(names), lines.count)
    at = np.ravel_multi_index((target, group, every.line), shape)
    present = np.zeros((shape[0], 1, shape[2]), dtype=bool)
    present[target, 0, every.line] = True
    start = np.flatnonzero(np.r_[True, lines.laser[1:] != lines.laser[:-1]])
    worst: dict[str, dict[str, Floats]] = {name: {} for name in scheme.targets}
    for condition, ratio in every.ratio.items():
        line = np.zeros(shape)
        np.maximum.at(line.reshape(-1), at, ratio)
        for n, name in enumerate(scheme.targets):
            other = scheme.scheme.fallback.get(name)
            each = line[n]
            if other is not None:
                each = np.where(present[n], each, line[scheme.targets.index(other)])
            worst[name][condition] = np.add.reduceat(each, start, axis=1).max(axis=0)
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
    lines: Lines, scheme: CompiledScheme, limits: dict[str, ClassLimits], exists: list[NDArray[np.bool_]]
) -> dict[str, NDArray[np.bool_]]:
    """Whether some class with these limits exists for each laser, and the limits for one of its lines."""
    found = {}
    for target, table in limits.items():
        has_rows = np.bincount(lines.laser[table.line], minlength=lines.lasers) > 0
        named = [
            there for rule, there in zip(scheme.scheme.classes, exists, strict=True) if rule.limits == target
        ]
        found[target] = has_rows & np.logical_or.reduce(named) if named else has_rows
    return found


def _choose(
    lines: Lines,
    scheme: CompiledScheme,
    worst: dict[str, dict[str, Floats]],
    exists: list[NDArray[np.bool_]],
) -> Ints:
    """Number of the first class whose conditions hold; the last class always does."""
    number = np.full(lines.lasers, len(scheme.scheme.classes) - 1, dtype=np.intp)
    holds_all = {target: np.maximum.reduce(list(r.values())) <= HOLDS for target, r in worst.items()}
    open_ = holds_all[scheme.scheme.ceiling]
    for k, rule in enumerate(scheme.scheme.classes[:-1]):
        assert rule.limits is not None
        if rule.aided_limits is None:
            holds = holds_all[rule.limits] & exists[k]
        else:
            ratios, aided = worst[rule.limits], worst[rule.aided_limits]
            holds = (ratios[UNAIDED] <= HOLDS) & exists[k]
            for condition in (c for c in ratios if c != UNAIDED):
                holds &= aided[condition] <= HOLDS
        number[open_ & holds] = k
        open_ = open_ & ~holds
    return number
