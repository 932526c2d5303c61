"""The one way into the computation: lines and a rule set to criteria, ratios and distances."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from service.assess.aid import Aid
from service.assess.criteria import Criteria, Exposures, exposures
from service.assess.distance import falling_root
from service.assess.groups import Groups
from service.assess.lines import Lines
from service.optics.encircled import encircled_fraction
from service.rules.compiled import CompiledRules
from service.rules.limits import Conditions
from service.rules.ruleset import TARGETS

if TYPE_CHECKING:
    from service.assess.look import Moving

__all__ = ["Evaluation", "Sums", "TargetResult", "evaluate", "optical_density"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


@dataclass(slots=True)
class Sums:
    """Lines that add: one element per additivity class of each laser that has several lines or waists.

    `members` lists the criteria (by number) of each group; ratios are at the most hazardous place.
    """

    laser: Ints
    members: list[Ints]
    place_m: Floats
    hazard_ratio: Floats
    near_m: Floats
    far_m: Floats


@dataclass(slots=True)
class TargetResult:
    """Everything for one target (eye or skin).

    Per criterion: `criteria`, `hazard_ratio` (at the laser's most hazardous place), `distance_m`
    (of the criterion alone). Per laser: `place_m` (the most hazardous place), `worst_ratio`
    (there, lines added), `near_m` and `far_m` (the hazard zone; 0, 0 where nothing is exceeded;
    infinite where a beam never falls below its limit) and `governing` (number of the criterion
    with the worst ratio of its own).
    """

    criteria: Criteria
    hazard_ratio: Floats
    distance_m: Floats
    place_m: Floats
    worst_ratio: Floats
    near_m: Floats
    far_m: Floats
    governing: Ints
    sums: Sums | None


@dataclass(slots=True)
class Evaluation:
    """The result of one batch under one rule set.

    `moving`: the setup of one laser whose limits change with the distance; the lines and limits here are
    then those of its most hazardous place.
    """

    rules: CompiledRules
    lines: Lines
    conditions: Conditions
    exposures: Exposures
    eye: TargetResult
    skin: TargetResult
    moving: Moving | None = None

    def target(self, name: str) -> TargetResult:
        """The result for `eye` or `skin`."""
        return self.eye if name == "eye" else self.skin


def optical_density(ratio: Floats) -> Floats:
    """Optical density that brings the worst ratio down to 1: max(0, log10(ratio)).

    Reference: OD = log10(H / MPE), the definition in ANSI Z136.1 and EN 207 (common practice).
    """
    with np.errstate(divide="ignore"):
        return np.maximum(0.0, np.log10(ratio))


def evaluate(lines: Lines, rules: CompiledRules, aid: Aid | None = None) -> Evaluation:
    """Judge every line of every laser by every criterion of the rule set.

    Parameters
    ----------
    lines : structure of arrays, a single laser is a batch of one
    rules : a compiled rule set
    aid : optics in front of the eye; lines from 302.5 to 4000 nm pass it, the others are judged without
    """
    if aid is not None:
        lines = aid.seen_through(lines)
    at = rules.conditions(lines.wavelength_nm, lines.subtense_mrad)
    found = exposures(lines, at, rules)
    cell = rules.cells(at, found.line, found.time_s)
    eye, skin = (_target(target, lines, found, cell, at, rules, aid) for target in TARGETS)
    return Evaluation(rules, lines, at, found, eye, skin)


def _target(
    target: str,
    lines: Lines,
    found: Exposures,
    cell: Ints,
    at: Conditions,
    rules: CompiledRules,
    aid: Aid | None,
) -> TargetResult:
    criteria = Criteria.of(target, found, cell, at, rules)
    if aid is not None and target == "eye":
        aid.collect(criteria, lines)
    laser = lines.laser[criteria.line]
    start = np.flatnonzero(np.r_[True, laser[1:] != laser[:-1]])
    place_of_line = lines.beams.last_waist_m()
    uneven = lines.beams.uneven()
    place = place_of_line[criteria.line]
    ratio = _ratio_at(criteria, lines, place_of_line)
    near, far = _alone(criteria, lines, place, ratio)
    if uneven.any():
        _alone_uneven(criteria, lines, np.flatnonzero(uneven[criteria.line]), near, far)
    worst = np.maximum.reduceat(ratio, start)
    lasers_place = place[start]
    lasers_far = np.maximum.reduceat(far, start)
    lasers_near = np.minimum.reduceat(np.where(far > 0.0, near, np.inf), start)
    sums = None
    grouped = (np.bincount(lines.laser) > 1) | (np.bincount(lines.laser, uneven) > 0)
    if grouped.any():
        sums = _sums(criteria, lines, rules, grouped)
    if sums is not None:
        again = np.unique(sums.laser)
        worst[again], lasers_far[again], lasers_near[again] = 0.0, 0.0, np.inf
        order = np.lexsort((sums.hazard_ratio, sums.laser))
        last = order[np.r_[sums.laser[order][1:] != sums.laser[order][:-1], True]]
        worst[again], lasers_place[again] = sums.hazard_ratio[last], sums.place_m[last]
        np.maximum.at(lasers_far, sums.laser, sums.far_m)
        np.minimum.at(lasers_near, sums.laser, np.where(sums.far_m > 0.0, sums.near_m, np.inf))
        moved = np.flatnonzero(lasers_place[laser] != place)
        if moved.size:
            beams = lines.beams.take(criteria.line[moved])
            fraction = beams.fraction(criteria.aperture_m[moved], lasers_place[laser[moved]])
            ratio[moved] = criteria.strength[moved] * fraction
    governing = np.flatnonzero(ratio == np.maximum.reduceat(ratio, start)[laser])
    governing = governing[np.r_[True, laser[governing][1:] != laser[governing][:-1]]]
    lasers_near = np.where(np.isinf(lasers_near), 0.0, lasers_near)
    return TargetResult(criteria, ratio, far, lasers_place, worst, lasers_near, lasers_far, governing, sums)


def _ratio_at(criteria: Criteria, lines: Lines, place_m: Floats) -> Floats:
    """Ratio of exposure to limit of each criterion, with each line at its own place [m]."""
    x, y = lines.beams.diameters_m(place_m)
    k = criteria.line
    ratio = criteria.strength * encircled_fraction(criteria.aperture_m, x[k], y[k], lines.beams.tophat[k])
    if lines.beams.extinction_per_m.any():
        ratio *= np.exp(-lines.beams.extinction_per_m * place_m)[k]
    return ratio


def _alone(criteria: Criteria, lines: Lines, place: Floats, ratio: Floats) -> tuple[Floats, Floats]:
    """Near and far end [m] of the zone in which each criterion alone is exceeded; 0, 0 if nowhere."""
    near, far = np.zeros(ratio.shape), np.zeros(ratio.shape)
    over = np.flatnonzero(ratio > 1.0)
    if over.size:
        beams = lines.beams.take(criteria.line[over])
        aperture, strength = criteria.aperture_m[over], criteria.strength[over]
        low, high = beams.reach_m(aperture, 1.0 / strength)

        def excess(k: Ints, z: Floats) -> Floats:
            return np.log(strength[k] * beams.take(k).fraction(aperture[k], z))

        far[over] = falling_root(excess, low, high)
        near[over] = np.maximum(0.0, 2.0 * place[over] - far[over])
    return near, far


def _alone_uneven(criteria: Criteria, lines: Lines, which: Ints, near: Floats, far: Floats) -> None:
    """Zones of single criteria of beams whose axes have different waists, filled in place."""
    line = criteria.line[which]
    groups = Groups(
        np.arange(len(which)),
        line,
        criteria.strength[which],
        criteria.aperture_m[which],
        lines.beams.take(line),
    )
    near[which], far[which] = groups.zones(*groups.peaks())


def _sums(criteria: Criteria, lines: Lines, rules: CompiledRules, grouped: NDArray[np.bool_]) -> Sums:
    """Groups of criteria that add, for lasers with several lines or with different waists."""
    laser = lines.laser[criteria.line]
    member = np.flatnonzero(grouped[laser])
    kind = rules.additivity[criteria.row[member]]
    order = member[np.lexsort((criteria.line[member], kind, laser[member]))]
    kind = rules.additivity[criteria.row[order]]
    new = np.r_[True, (laser[order][1:] != laser[order][:-1]) | (kind[1:] != kind[:-1])]
    group = np.cumsum(new) - 1
    groups = Groups(
        group,
        criteria.line[order],
        criteria.strength[order],
        criteria.aperture_m[order],
        lines.beams.take(criteria.line[order]),
    )
    place, peak = groups.peaks()
    near, far = groups.zones(place, peak)
    return Sums(laser[order][new], np.split(order, np.flatnonzero(new)[1:]), place, peak, near, far)
