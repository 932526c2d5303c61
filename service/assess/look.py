"""Ratios and distances of a setup whose limits change with the distance."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.assess.aid import Aid
from service.assess.criteria import Criteria, exposures
from service.assess.distance import falling_root
from service.assess.evaluate import Evaluation, Sums, TargetResult, evaluate
from service.assess.lines import CW, Lines
from service.assess.moving import Setup
from service.rules.compiled import CompiledRules
from service.rules.grid import SMALL_SOURCE_MRAD
from service.rules.ruleset import TARGETS

__all__ = ["Moving", "look"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: Angles at which published rules for repeated pulses or for the source change [mrad].
EDGES_MRAD = (SMALL_SOURCE_MRAD, 5.0, 100.0)
#: A spot of any width is at most this much worse than a small one at the same distance: C_E C_P is at
#: least 5 / 1.5 x 0.2 where C_P falls with the width (IEC 60825-1, from memory), so 1 / 0.67, and a margin.
WORSE_THAN_SMALL = 4.0
#: A swept beam that never spreads is followed this far [m].
FARTHEST_M = 1e7
NARROWINGS = 60
#: No criterion is asked for by itself.
NONE = np.zeros(0, dtype=np.intp)


@dataclass(slots=True)
class Judged:
    """Many places judged, the worst variant of each.

    `worst` (places,): lines added; `variant` (places,): the one in which that happens. `ratio` and
    `limit_j_m2` (places, keys) by criterion, `sums` (places, kinds) by additivity class; 0 where a criterion
    does not hold.
    """

    worst: Floats
    variant: Ints
    ratio: Floats
    limit_j_m2: Floats
    sums: Floats


class Moving:
    """One setup under one rule set, judged at any distance.

    Parameters
    ----------
    setup : one laser
    rules, aid : as for `evaluate`
    """

    def __init__(self, setup: Setup, rules: CompiledRules, aid: Aid | None = None) -> None:
        self.setup, self.rules, self.aid = setup, rules, aid
        lines = setup.lines
        if setup.spots is not None:
            self.setup = Setup(lines, setup.spots.through(aid, lines))
        elif aid is not None:
            self.setup = Setup(aid.seen_through(lines), None, setup.scan)
        #: The beam standing still, or the spots as small ones: never less hazardous than the setup by more
        #: than `WORSE_THAN_SMALL`.
        self.still = evaluate(lines, rules, aid)
        # Every tissue and effect by the number of its limit row.
        names = [(row.tissue, row.effect) for row in rules.rules.limits]
        kinds = sorted(set(names))
        photochemical = np.array([effect == "photochemical" for _, effect in names])
        self.aperture_m = np.zeros(lines.count)
        time = np.where(lines.mode == CW, lines.exposure_s, lines.pulse_s)
        field = np.full(lines.count, np.inf)
        for target in TARGETS:
            criteria = self.still.target(target).criteria
            np.maximum.at(self.aperture_m, criteria.line, criteria.aperture_m)
            narrow = criteria.line[photochemical[criteria.row]]
            field[narrow] = rules.factor("field_angle")(lines.exposure_s[narrow])
        widest = rules.factor("alpha_max")(time)
        self.trusted_mrad = np.minimum(widest, field)
        self.edges_mrad = np.unique(np.r_[EDGES_MRAD, widest, field[np.isfinite(field)]])
        self._kind = np.array([kinds.index(name) for name in names])

    def key(self, criteria: Criteria, rule: Ints) -> Ints:
        """What identifies a criterion at every distance: line, rule, tissue and effect."""
        found: Ints = (criteria.line % self.setup.lines.count * 4 + rule) * 100 + self._kind[criteria.row]
        return found

    def _criteria(self, lines: Lines, target: str) -> tuple[Criteria, Ints]:
        """The criteria of lines as they stand, and the rule of each."""
        at = self.rules.conditions(lines.wavelength_nm, lines.subtense_mrad)
        found = exposures(lines, at, self.rules)
        criteria = Criteria.of(target, found, self.rules.cells(at, found.line, found.time_s), at, self.rules)
        if self.aid is not None and target == "eye":
            self.aid.collect(criteria, lines)
        return criteria, found.rule[criteria.exposure]

    def judge(self, target: str, places_m: Floats, keys: Ints, kinds: Ints) -> Judged:
        """Judge every variant at places (p,) [m]; `keys` and `kinds`, ascending, are what is asked for."""
        count, n = self.setup.lines.count, len(places_m)
        found = Judged(
            np.zeros(n),
            np.zeros(n, dtype=np.intp),
            np.zeros((n, len(keys))),
            np.zeros((n, len(keys))),
            np.zeros((n, len(kinds))),
        )
        variants = self.setup.from_distances(places_m, self.aperture_m, self.trusted_mrad)
        for number, lines in enumerate(variants):
            criteria, rule = self._criteria(lines, target)
            place, line = np.divmod(criteria.line, count)
            inside = lines.beams.take(criteria.line).fraction(criteria.aperture_m, places_m[place])
            each = criteria.strength * inside
            names, kind = np.unique(self.rules.additivity[criteria.row], return_inverse=True)
            by_line = np.zeros((n, len(names), count))
            np.maximum.at(by_line, (place, kind, line), each)
            sums = by_line.sum(axis=2)
            total = sums.max(axis=1)
            found.variant = np.where(total > found.worst, number, found.variant)
            found.worst = np.maximum(found.worst, total)
            for k in np.flatnonzero(np.isin(names, kinds)):
                column = int(np.searchsorted(kinds, names[k]))
                found.sums[:, column] = np.maximum(found.sums[:, column], sums[:, k])
            key = self.key(criteria, rule)
            asked = np.flatnonzero(np.isin(key, keys))
            asked = asked[np.argsort(each[asked], kind="stable")]
            cell = place[asked], np.searchsorted(keys, key[asked])
            ratio, limit = np.zeros(found.ratio.shape), np.zeros(found.ratio.shape)
            # Of several that share a cell the last, which has the highest ratio, stays.
            ratio[cell], limit[cell] = each[asked], criteria.limit_j_m2[asked]
            higher = ratio > found.ratio
            found.ratio = np.where(higher, ratio, found.ratio)
            found.limit_j_m2 = np.where(higher, limit, found.limit_j_m2)
        return found

    def over(self, evaluation: Evaluation, target: str, places_m: Floats) -> tuple[Floats, Floats, Floats]:
        """Limit [J/m2] and ratio (places, criteria) of an evaluation's criteria, and the worst ratio."""
        criteria = evaluation.target(target).criteria
        key = self.key(criteria, evaluation.exposures.rule[criteria.exposure])
        keys = np.unique(key)
        found = self.judge(target, places_m, keys, NONE)
        column = np.searchsorted(keys, key)
        return found.limit_j_m2[:, column], found.ratio[:, column], found.worst

    def worst_from(self, target: str, distance_m: float) -> float:
        """Worst ratio at a distance [m] or anywhere beyond."""
        grid = self.grid()
        places = np.r_[max(distance_m, grid[0]), grid[grid > distance_m]]
        return float(self.judge(target, places, NONE, NONE).worst.max())

    def grid(self) -> Floats:
        """Places [m] between which every ratio falls or jumps; beyond the last nothing is exceeded."""
        far = max(float(self.still.target(target).far_m[0]) for target in TARGETS)
        if self.setup.spots is not None:
            nearest = float(self.setup.lines.beams.nearest_m[0])
            return self.setup.places(WORSE_THAN_SMALL * max(far, nearest), self.edges_mrad)
        return self.setup.places(far if np.isfinite(far) else FARTHEST_M, self.edges_mrad)

    def at(self, distance_m: float, variant: int | None = None) -> Evaluation:
        """The setup as somebody at a distance [m] meets it, limits as they hold there.

        Of several variants the worst for the eye is shown, unless one is chosen. Distances are not solved.
        """
        place = np.array([distance_m])
        if variant is None:
            variant = int(self.judge("eye", place, NONE, NONE).variant[0])
        lines = self.setup.from_distances(place, self.aperture_m, self.trusted_mrad)[variant]
        at = self.rules.conditions(lines.wavelength_nm, lines.subtense_mrad)
        found = exposures(lines, at, self.rules)
        eye, skin = (self._target(lines, target, distance_m) for target in TARGETS)
        return Evaluation(self.rules, lines, at, found, eye, skin, moving=self)

    def _target(self, lines: Lines, target: str, place_m: float) -> TargetResult:
        """One target at a place, without distances."""
        criteria, _ = self._criteria(lines, target)
        place = np.full(len(criteria.line), place_m)
        inside = lines.beams.take(criteria.line).fraction(criteria.aperture_m, place)
        ratio = criteria.strength * inside
        nowhere = np.zeros(1)
        worst = self.judge(target, np.array([place_m]), NONE, NONE).worst
        return TargetResult(
            criteria,
            ratio,
            np.zeros(ratio.shape),
            np.array([place_m]),
            worst,
            nowhere,
            nowhere.copy(),
            np.array([int(ratio.argmax())]),
            None,
        )


def look(setup: Setup, rules: CompiledRules, aid: Aid | None = None) -> Evaluation:
    """Evaluate one setup: the limits of its most hazardous place, distances with the limits that hold there.

    Reference: the definition of the hazard distance, solved with the limit as a function of the distance
    (ANSI Z136.1 appendix B for extended diffuse sources, from memory).
    """
    moving = Moving(setup, rules, aid)
    grid = moving.grid()
    place, variant = _worst_place(moving, "eye", grid)
    evaluation = moving.at(place, variant)
    for target in TARGETS:
        _solve(moving, evaluation, target, grid, place if target == "eye" else None)
    return evaluation


def _worst_place(moving: Moving, target: str, grid: Floats) -> tuple[float, int]:
    """The most hazardous place [m] and the variant there."""
    found = moving.judge(target, grid, NONE, NONE)
    k = int(found.worst.argmax())
    place, top, variant = float(grid[k]), float(found.worst[k]), int(found.variant[k])
    low, high = float(grid[max(k - 1, 0)]), float(grid[min(k + 1, len(grid) - 1)])
    focused = float(moving.setup.lines.beams.last_waist_m().max()) > grid[0]
    for _ in range(NARROWINGS if focused else 0):
        pair = np.array([low + (high - low) / 3.0, high - (high - low) / 3.0])
        two = moving.judge(target, pair, NONE, NONE)
        best = int(two.worst.argmax())
        if two.worst[best] > top:
            place, top, variant = float(pair[best]), float(two.worst[best]), int(two.variant[best])
        low, high = (float(pair[0]), high) if two.worst[0] < two.worst[1] else (low, float(pair[1]))
    return place, variant


def _solve(moving: Moving, evaluation: Evaluation, target: str, grid: Floats, place_m: float | None) -> None:
    """Fill in distances, sums and the worst place of one target."""
    result = evaluation.target(target)
    if place_m is None:
        place_m, _ = _worst_place(moving, target, grid)
    criteria = result.criteria
    key = moving.key(criteria, evaluation.exposures.rule[criteria.exposure])
    kind = moving.rules.additivity[criteria.row]
    keys, kinds = np.unique(key), np.unique(kind)

    def columns(places_m: Floats) -> Floats:
        found = moving.judge(target, places_m, keys, kinds)
        return np.concatenate([found.worst[:, None], found.ratio, found.sums], axis=1)

    grid = np.unique(np.r_[grid, place_m])
    values = columns(grid)
    far = _ends(lambda which, z: columns(z)[np.arange(len(z)), which], grid, values)
    there = columns(np.array([place_m]))[0]
    column = 1 + np.searchsorted(keys, key)
    result.distance_m, result.hazard_ratio = far[column], there[column]
    result.place_m, result.worst_ratio = np.array([place_m]), there[:1]
    result.governing = np.array([int(result.hazard_ratio.argmax())])
    result.far_m, result.near_m = far[:1], np.array([_near(columns, grid, values[:, 0])])
    if evaluation.lines.count > 1:
        first = 1 + len(keys)
        result.sums = Sums(
            laser=np.zeros(len(kinds), dtype=np.intp),
            members=[np.flatnonzero(kind == name) for name in kinds],
            place_m=np.full(len(kinds), place_m),
            hazard_ratio=there[first:],
            near_m=np.zeros(len(kinds)),
            far_m=far[first:],
        )


def _ends(value: Callable[[Ints, Floats], Floats], grid: Floats, values: Floats) -> Floats:
    """Farthest place [m] at which each column exceeds 1: 0 if nowhere, infinite if at the last place."""
    over = values > 1.0
    far = np.zeros(values.shape[1])
    some = np.flatnonzero(over.any(axis=0))
    last = len(grid) - 1 - over[::-1, some].argmax(axis=0)
    far[some[last == len(grid) - 1]] = np.inf
    within = some[last < len(grid) - 1]
    last = last[last < len(grid) - 1]

    def excess(k: Ints, z: Floats) -> Floats:
        return np.log(np.maximum(value(within[k], z), 1e-300))

    far[within] = falling_root(excess, grid[last], grid[last + 1])
    return far


def _near(columns: Callable[[Floats], Floats], grid: Floats, worst: Floats) -> float:
    """Nearest place [m] at which the worst ratio exceeds 1; 0 where that is the nearest place of all."""
    over = np.flatnonzero(worst > 1.0)
    if not over.size or over[0] == 0:
        return 0.0
    before, after = float(grid[over[0] - 1]), float(grid[over[0]])

    def excess(k: Ints, back: Floats) -> Floats:
        return np.log(np.maximum(columns(after - back)[:, 0], 1e-300))

    return after - float(falling_root(excess, np.zeros(1), np.array([after - before]))[0])
