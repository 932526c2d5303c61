"""What protection a setup needs, and whether a pair of eyewear will do."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.assess.criteria import AVERAGE
from service.assess.evaluate import Evaluation, optical_density
from service.assess.lines import PULSE, TRAIN
from service.assess.loads import loads
from service.assess.marking import Mark
from service.assess.scales import SLACK, AlignmentNeed, ScaleNeed, alignment_need, scale_needs
from service.assess.viewing import sum_of_lines
from service.rules.eyewear import EyewearTables

__all__ = [
    "Coverage",
    "LineNeed",
    "LineVerdict",
    "ModeVerdict",
    "Pair",
    "PairVerdict",
    "judge",
    "line_needs",
    "ranked",
]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: Below this luminous transmittance a pair asks for more light in the room (common practice, no source).
DARK = 0.20


@dataclass(frozen=True, slots=True)
class LineNeed:
    """What one line asks for at one place [m].

    `scales` are the EN 207 modes and `ratios` the worst ratio of exposure to limit among the eye criteria
    of each, `loads` the number of each with the lines of a band added; `alignment` is the EN 208 number
    where it exists. `slow`: pulses that come singly, or too seldom for a pair marked Y.
    """

    line: int
    wavelength_nm: float
    distance_m: float
    scales: list[ScaleNeed]
    ratios: list[float]
    loads: list[int]
    slow: bool
    alignment: AlignmentNeed | None

    @property
    def ratio(self) -> float:
        """The line's worst ratio of exposure to limit."""
        return max(self.ratios)

    @property
    def densities(self) -> list[float]:
        """Optical density that brings the ratio of each mode to 1."""
        found: list[float] = optical_density(np.array(self.ratios)).tolist()
        return found

    @property
    def density(self) -> float:
        """Optical density that brings the line's worst ratio to 1."""
        return max(self.densities)

    @property
    def numbers(self) -> list[int]:
        """Scale number of each mode: by the table and, as transmittance, by the rule set's limits."""
        pairs = zip(self.strengths, self.densities, strict=True)
        return [max(strength, math.ceil(density - SLACK)) for strength, density in pairs]

    @property
    def strengths(self) -> list[int]:
        """Scale number of each mode by the table, with size factor and the other lines of the band."""
        return [max(s.wide, load) for s, load in zip(self.scales, self.loads, strict=True)]

    @property
    def number(self) -> int:
        """Scale number that meets every mode."""
        return max(self.numbers)

    @property
    def table_too_weak(self) -> bool:
        """Whether the scale table asks less of a mode than the rule set's limits need."""
        return any(n > s for n, s in zip(self.numbers, self.strengths, strict=True))


@dataclass(frozen=True, slots=True)
class Coverage:
    """What a pair offers from `from_nm` to `to_nm`: an optical density, marks, or both."""

    from_nm: float
    to_nm: float
    density: float | None
    marks: tuple[Mark, ...]


@dataclass(frozen=True, slots=True)
class Pair:
    """A pair of eyewear: coverages by wavelength and the luminous transmittance (0 to 1)."""

    name: str
    coverages: tuple[Coverage, ...]
    luminous_transmittance: float | None


@dataclass(frozen=True, slots=True)
class ModeVerdict:
    """One mode of one line: the scale number needed and the one marked (None: not marked)."""

    mode: str
    needed: int
    marked: int | None

    @property
    def enough(self) -> bool:
        """Whether the mark will do."""
        return self.needed == 0 or (self.marked is not None and self.marked >= self.needed)


@dataclass(frozen=True, slots=True)
class LineVerdict:
    """One line against one pair: density needed and offered, modes, what is missing.

    `density` is None where a mode is left without any; `passed` is the transmittance for each mode of the
    need; `resists` says whether a mark shows that
    the filter withstands the beam, or the beam asks for none.
    """

    line: int
    wavelength_nm: float
    covered: bool
    density_needed: float
    density: float | None
    passed: list[float]
    remaining_ratio: float
    modes: list[ModeVerdict]
    missing: list[str]
    resists: bool

    @property
    def enough(self) -> bool:
        """Whether nothing is missing for this line."""
        return not self.missing


@dataclass(frozen=True, slots=True)
class PairVerdict:
    """A pair against a laser.

    `remaining_ratio` adds the lines behind the filter, each at its own place of the needs (an upper
    bound where the waists differ). `resistance_shown`: marks show that it withstands every line that
    asks for it; lines that need no filter, alone and together, ask for none.
    """

    pair: Pair
    lines: list[LineVerdict]
    remaining_ratio: float
    resistance_shown: bool
    warnings: list[str]
    alignment_only: bool

    @property
    def dense_enough(self) -> bool:
        """Whether every line is covered strongly enough and their sum stays within the limit."""
        held = self.remaining_ratio <= 1.0 + SLACK
        return not self.alignment_only and all(v.enough for v in self.lines) and held

    @property
    def sufficient(self) -> bool:
        """Dense enough, and shown to withstand the beam; never for alignment eyewear."""
        return self.dense_enough and self.resistance_shown


def line_needs(
    evaluation: Evaluation, ratio: Floats, place_m: Floats, tables: EyewearTables, *, onward: bool
) -> list[LineNeed]:
    """Needs of every line of one laser; `ratio` are its eye criteria's ratios with each line at `place_m`.

    With `onward` the strength is that of the worst place from there on.
    """
    lines, found = evaluation.lines, evaluation.eye.criteria
    places = place_m.tolist()
    every = [scale_needs(lines, k, place, tables) for k, place in enumerate(places)]
    loaded = loads(lines, every, tables, onward_m=places if onward else None)
    seldom = tables.use["en207_mark_y_rate"].value
    needs = []
    for k in range(lines.count):
        place, scales = places[k], every[k]
        modes = _mode_of(evaluation, k, scales)
        own = ratio[found.line == k]
        needs.append(
            LineNeed(
                line=k,
                wavelength_nm=float(lines.wavelength_nm[k]),
                distance_m=place,
                scales=scales,
                ratios=[float(own[modes == n].max(initial=0.0)) for n in range(len(scales))],
                loads=loaded[k],
                slow=bool(lines.mode[k] == PULSE or (lines.mode[k] == TRAIN and lines.rate_hz[k] <= seldom)),
                alignment=alignment_need(lines, k, place, tables),
            )
        )
    return needs


def _mode_of(evaluation: Evaluation, line: int, scales: list[ScaleNeed]) -> Ints:
    """For each eye criterion of a line the index of the mode that it belongs to.

    The pulse mode comes first; the criterion of the average power belongs to mode D beside it.
    """
    found = evaluation.eye.criteria
    rule = evaluation.exposures.rule[found.exposure[found.line == line]]
    return np.where(rule == AVERAGE, len(scales) - 1, 0)


def judge(pair: Pair, evaluation: Evaluation, ratio: Floats, needs: list[LineNeed]) -> PairVerdict:
    """Whether a pair will do against every line, at the places for which `ratio` and `needs` hold."""
    verdicts = [_line(pair, need) for need in needs]
    found = evaluation.eye.criteria
    passed = np.ones(ratio.shape)
    for need, verdict in zip(needs, verdicts, strict=True):
        own = np.flatnonzero(found.line == need.line)
        passed[own] = np.array(verdict.passed)[_mode_of(evaluation, need.line, need.scales)]
    remaining = sum_of_lines(evaluation, evaluation.eye, ratio * passed)
    unproved = [v.line for v in verdicts if not v.resists]
    bare = np.where(np.isin(found.line, unproved), 1.0, passed)
    shown = not unproved or sum_of_lines(evaluation, evaluation.eye, ratio * bare) <= 1.0 + SLACK
    alignment = any(m.scale == "RB" for c in pair.coverages for m in c.marks)
    warnings = _warnings(pair, verdicts, alignment)
    if remaining > 1.0 + SLACK and all(v.enough for v in verdicts) and not alignment:
        warnings.append(
            "Each line alone is covered, but together they still exceed the limit behind the filter."
        )
    return PairVerdict(pair, verdicts, remaining, shown, warnings, alignment)


def _warnings(pair: Pair, verdicts: list[LineVerdict], alignment: bool) -> list[str]:
    marks = [m for c in pair.coverages for m in c.marks]
    warnings = []
    if alignment:
        warnings.append(
            "Alignment eyewear: it lets a visible beam through on purpose, down to Class 2. It protects "
            "against an unintended glance while aligning and against nothing else."
        )
    if pair.luminous_transmittance is not None and pair.luminous_transmittance < DARK:
        warnings.append(
            f"Luminous transmittance {100 * pair.luminous_transmittance:g} % is below {100 * DARK:g} %: "
            "the room looks dark through it. Add light, and mark edges and steps."
        )
    if any(m.low_rate_untested for m in marks):
        warnings.append("Marked Y: not tested at low repetition rates; check the rate with the maker.")
    if any(v.covered and not v.resists and not v.modes for v in verdicts):
        warnings.append(
            "An optical density alone says how much the filter lets through, not whether filter and frame "
            "withstand the beam. Ask the maker for a mark or a damage threshold above the values here."
        )
    if any(m.scale == "AB" for m in marks):
        warnings.append("AB numbers belong to screens, not to eyewear.")
    if any(len(_densities(pair, v.wavelength_nm)) > 1 for v in verdicts):
        warnings.append("Ranges overlap at a wavelength of this laser: the weaker one counts.")
    return warnings


def _holding(pair: Pair, wavelength: float) -> list[Coverage]:
    return [c for c in pair.coverages if c.from_nm <= wavelength <= c.to_nm]


def _densities(pair: Pair, wavelength: float) -> list[float]:
    return [c.density for c in _holding(pair, wavelength) if c.density is not None]


def _line(pair: Pair, need: LineNeed) -> LineVerdict:
    """One line: of several ranges that hold its wavelength the weaker counts."""
    wavelength = need.wavelength_nm
    marks = [m for c in _holding(pair, wavelength) for m in c.marks if _holds(m, c, wavelength)]
    stated = min(_densities(pair, wavelength), default=None)
    lasting = [m for m in marks if m.scale == "LB"]
    aligning = [m.number for m in marks if m.scale == "RB"]
    modes, offered, missing = [], [], []
    if aligning and need.density > 0.0:
        missing.append(_alignment_text(max(aligning), need.alignment))
    asked = zip(need.scales, need.numbers, need.strengths, need.densities, strict=True)
    for scale, number, strength, density in asked:
        marked = min((m.number for m in lasting if scale.mode in m.modes), default=None)
        offered.append(_offered(scale.mode, stated, marked, marked_at_all=bool(lasting)))
        if lasting:
            dense = scale.mode == "D" and stated is not None and stated >= density - SLACK
            modes.append(ModeVerdict(scale.mode, strength if dense else number, marked))
    known = [d for d in offered if d is not None]
    short, wanted = max((n - (d or 0.0), n) for n, d in zip(need.densities, offered, strict=True))
    if stated is None and not lasting:
        if need.density > 0.0 and not aligning:
            missing.append(f"{wavelength:g} nm is not covered")
    elif short > SLACK and all(m.enough for m in modes):
        missing.append(
            f"optical density {wanted - short:g} where {_up(wanted)} is needed: {_up(short)} short"
        )
    for scale, verdict, strength in zip(need.scales, modes, need.strengths, strict=False):
        if not verdict.enough:
            missing.append(_mode_text(scale, verdict, strength))
    passed = [10.0**-d if d is not None else 1.0 for d in offered]
    return LineVerdict(
        line=need.line,
        wavelength_nm=wavelength,
        covered=bool(lasting) or stated is not None,
        density_needed=need.density,
        density=min(known) if len(known) == len(offered) else None,
        passed=passed,
        remaining_ratio=max(r * p for r, p in zip(need.ratios, passed, strict=True)),
        modes=modes,
        missing=missing,
        resists=max(need.strengths) == 0
        or (bool(modes) and all(m.enough for m in modes) and not _untested(need, lasting)),
    )


def _offered(mode: str, stated: float | None, marked: int | None, *, marked_at_all: bool) -> float | None:
    """Density on which to count in a mode.

    A mark LBn promises a transmittance of at most 10^-n. A filter can let more of a strong pulse
    through than the density measured with weak light says: in pulse modes a mark must stand, and the
    weaker of both counts.
    """
    if not marked_at_all or (mode == "D" and stated is not None):
        return stated
    if marked is None:
        return None
    return float(marked) if stated is None else min(float(marked), stated)


def _untested(need: LineNeed, marks: list[Mark]) -> bool:
    """Whether a mark Y says that the pair was not tested for pulses as rare as these."""
    return need.slow and any(m.low_rate_untested for m in marks)


def _holds(mark: Mark, coverage: Coverage, wavelength: float) -> bool:
    low = coverage.from_nm if mark.from_nm is None else mark.from_nm
    high = coverage.to_nm if mark.to_nm is None else mark.to_nm
    return low <= wavelength <= high


def _alignment_text(marked: int, need: AlignmentNeed | None) -> str:
    text = f"alignment eyewear RB{marked} only, which lets the beam through"
    if need is None:
        return f"{text}; it is not meant for this line"
    if need.number is None:
        return f"{text}; the beam is beyond RB5 even for aligning"
    enough = "enough for aligning" if marked >= need.number else f"aligning asks for RB{need.number}"
    return f"{text}; {enough}"


def _mode_text(scale: ScaleNeed, verdict: ModeVerdict, strength: int) -> str:
    needed, marked = verdict.needed, verdict.marked
    have = "no mark" if marked is None else f"LB{marked}"
    if needed > 10:
        return f"mode {scale.mode}: {have}; the beam is beyond LB10, no scale number will do"
    text = f"mode {scale.mode}: {have} where LB{needed} is needed"
    if needed > strength:
        text = f"{text} by the limits (LB{strength} by the scale table)"
    elif strength > scale.wide:
        text = f"{text} with all that loads the filter (LB{scale.wide} for this line alone at its place)"
    elif marked is not None and marked >= scale.number:
        return f"{text} for so wide a beam (LB{scale.number} without the remembered size factor)"
    return text if marked is None else f"{text}: {needed - marked} short"


def _up(value: float) -> str:
    """Two decimals, rounded up."""
    return f"{math.ceil(value * 100 - 1e-9) / 100:g}"


def ranked(verdicts: list[PairVerdict]) -> list[int]:
    """Indices of the pairs: sufficient first, then dense enough, then the most light, then as given."""

    def key(k: int) -> tuple[bool, bool, float, int]:
        light = verdicts[k].pair.luminous_transmittance
        found = verdicts[k]
        return not found.sufficient, not found.dense_enough, 0.0 if light is None else -light, k

    return sorted(range(len(verdicts)), key=key)
