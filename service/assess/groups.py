"""Exposures that add: the summed ratio of several lines over distance.

A group is a set of criteria of one laser whose tissue and additivity class agree. Each line enters
with its worst criterion (stricter than adding like with like), the lines add. Where lines or axes
have different waists the sum need not fall from the exit on, so it is sampled up to the last waist;
a single criterion of a beam whose axes have different waists, or that converges in hazy air, is a
group of one.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.assess.distance import falling_root
from service.optics.beams import Beams

__all__ = ["Groups"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: Places between the exit and the last waist at which a sum with several waists is sampled.
SAMPLES = 96
REFINEMENTS = 80


class Groups:
    """Groups of criteria; all member arrays are ordered by group, then line.

    Parameters
    ----------
    group : (m,) group number of each member, ascending from 0 without a gap
    line : (m,) line of each member, ascending within a group
    strength, aperture_m : (m,) as in `Criteria`
    beams : one beam per member
    """

    def __init__(self, group: Ints, line: Ints, strength: Floats, aperture_m: Floats, beams: Beams) -> None:
        self.strength, self.aperture_m, self.beams = strength, aperture_m, beams
        self.group = group
        self.count = int(group[-1]) + 1
        new_group = np.r_[True, group[1:] != group[:-1]]
        new_line = new_group | np.r_[True, line[1:] != line[:-1]]
        self._lines = np.flatnonzero(new_line)
        self._groups = np.flatnonzero(new_group[self._lines])
        self._start = np.flatnonzero(new_group)
        self._size = np.diff(np.r_[self._start, len(group)])
        self._line_number = np.cumsum(new_line) - 1

    def ratio(self, index: Ints, distance_m: Floats) -> Floats:
        """Summed ratio of exposure to limit of the groups `index` at one distance [m] each."""
        if len(index) == self.count:
            member, size = np.arange(len(self.group)), self._size
            heads, sums = self._lines, self._groups
        else:
            size = self._size[index]
            offset = np.repeat(self._start[index] - (np.cumsum(size) - size), size)
            member = np.arange(size.sum()) + offset
            number = self._line_number[member]
            first = np.cumsum(size) - size
            new = np.r_[True, number[1:] != number[:-1]]
            heads = np.flatnonzero(new)
            sums = np.searchsorted(heads, first)
        beams = self.beams.take(member)
        each = self.strength[member] * beams.fraction(self.aperture_m[member], np.repeat(distance_m, size))
        worst = np.maximum.reduceat(each, heads)
        return np.add.reduceat(worst, sums)

    def _excess(self, index: Ints, distance_m: Floats) -> Floats:
        with np.errstate(divide="ignore"):
            return np.log(self.ratio(index, distance_m))

    def last_waist_m(self) -> Floats:
        """Distance [m] per group beyond which every member only widens."""
        return np.maximum.reduceat(self.beams.last_waist_m(), self._start)

    def nearest_m(self) -> Floats:
        """The nearest accessible place [m] of each group."""
        return np.maximum.reduceat(self.beams.nearest_m, self._start)

    def peaks(self) -> tuple[Floats, Floats]:
        """Most hazardous place [m] of each group and the summed ratio there.

        One waist for all (or none downstream): that waist. Otherwise sampling, then narrowing.
        """
        last = self.last_waist_m()
        place = last.copy()
        value = self.ratio(np.arange(self.count), place)
        several = self._several_waists()
        if several.size:
            places, values = self._sample(several)
            k = values.argmax(axis=1)
            rows = np.arange(len(several))
            low = places[rows, np.maximum(k - 1, 0)]
            high = places[rows, np.minimum(k + 1, places.shape[1] - 1)]
            best, top = places[rows, k], values[rows, k]
            for _ in range(REFINEMENTS):
                left, right = low + (high - low) / 3.0, high - (high - low) / 3.0
                at_left, at_right = self.ratio(several, left), self.ratio(several, right)
                for z, r in ((left, at_left), (right, at_right)):
                    best, top = np.where(r > top, z, best), np.maximum(r, top)
                low, high = np.where(at_left < at_right, left, low), np.where(at_left < at_right, high, right)
            place[several], value[several] = best, top
        return place, value

    def _several_waists(self) -> Ints:
        """Groups whose members' waists, seen from the exit on, differ."""
        low = np.minimum.reduceat(self.beams.first_waist_m(), self._start)
        uneven = np.maximum.reduceat(self.beams.uneven(), self._start)
        return np.flatnonzero((low != self.last_waist_m()) | uneven)

    def _sample(self, index: Ints) -> tuple[Floats, Floats]:
        """Places (k, s) from the exit to the last waist, every waist among them, and the ratios."""
        last, nearest = self.last_waist_m()[index], self.nearest_m()[index]
        widest = int(self._size[index].max())
        waists = np.zeros((len(index), 2 * widest))
        for n, g in enumerate(index):
            member = slice(self._start[g], self._start[g] + self._size[g])
            waists[n, : self._size[g]] = self.beams.waist_x_m[member]
            waists[n, widest : widest + self._size[g]] = self.beams.waist_y_m[member]
        waists = np.maximum(nearest[:, None], waists)
        even = nearest[:, None] + (last - nearest)[:, None] * np.linspace(0.0, 1.0, SAMPLES)
        places = np.sort(np.concatenate([even, waists], axis=1), axis=1)
        values = np.stack([self.ratio(index, places[:, k]) for k in range(places.shape[1])], axis=1)
        return places, values

    def zones(self, place_m: Floats, peak: Floats) -> tuple[Floats, Floats]:
        """Nearest and farthest distance [m] at which each group's ratio exceeds 1; 0, 0 if nowhere.

        `place_m` and `peak` as `peaks` returns them. Infinite where the ratio never falls to 1.
        """
        near, far = np.zeros(self.count), np.zeros(self.count)
        over = np.flatnonzero(peak > 1.0)
        if not over.size:
            return near, far
        last = self.last_waist_m()
        at_last = self.ratio(over, last[over])
        low, high = np.where(at_last > 1.0, last[over], place_m[over]), last[over].copy()
        near_low, near_high = self.nearest_m()[over], place_m[over].copy()
        several = np.isin(over, self._several_waists())
        if several.any():
            places, values = self._sample(over[several])
            exceeded = values > 1.0
            rows = np.arange(len(places))
            some = exceeded.any(axis=1)
            final = places.shape[1] - 1 - exceeded[:, ::-1].argmax(axis=1)
            after = np.minimum(final + 1, places.shape[1] - 1)
            inner = some & (at_last[several] <= 1.0) & (places[rows, final] > place_m[over][several])
            lows, highs = low[several], high[several]
            lows[inner], highs[inner] = places[rows, final][inner], places[rows, after][inner]
            low[several], high[several] = lows, highs
            first = exceeded.argmax(axis=1)
            before = np.maximum(first - 1, 0)
            early = some & (places[rows, first] < place_m[over][several])
            nears, ends = near_low[several], near_high[several]
            nears[early], ends[early] = places[rows, before][early], places[rows, first][early]
            near_low[several], near_high[several] = nears, ends
        beyond = at_last > 1.0
        if beyond.any():
            low[beyond], high[beyond] = self._beyond(over[beyond])
        far[over] = falling_root(lambda k, z: self._excess(over[k], z), low, high)
        nearest = self.nearest_m()[over]
        k = np.flatnonzero(self.ratio(over, nearest) <= 1.0)
        if k.size:
            start, width = near_high[k], near_high[k] - near_low[k]
            near[over[k]] = start - falling_root(
                lambda n, s: self._excess(over[k[n]], start[n] - s), np.zeros(len(k)), width
            )
        return near, far

    def _beyond(self, index: Ints) -> tuple[Floats, Floats]:
        """Bracket [m] beyond the last waist: above the farthest single member, below n-fold ones."""
        size = self._size[index]
        offset = np.repeat(self._start[index] - (np.cumsum(size) - size), size)
        member = np.arange(size.sum()) + offset
        head = np.cumsum(size) - size
        beams, aperture, strength = self.beams.take(member), self.aperture_m[member], self.strength[member]
        last = np.repeat(self.last_waist_m()[index], size)
        lines = np.repeat(size, size)
        ends = []
        for factor, side in ((1.0, 0), (lines, 1)):
            reach = beams.reach_m(aperture, np.minimum(1.0, 1.0 / (strength * factor)))[side]
            reach = np.where(strength * factor > 1.0, reach, 0.0)
            ends.append(np.maximum.reduceat(np.maximum(reach, last), head))
        return ends[0], ends[1]
