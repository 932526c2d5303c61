"""What protection a setup needs, and whether a pair of eyewear will do."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation, TargetResult
from service.assess.marking import Mark
from service.assess.scales import AlignmentNeed, ScaleNeed, alignment_need, scale_needs
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

#: Below this luminous transmittance a pair asks for more light in the room (common practice, no source).
DARK = 0.20


@dataclass(frozen=True, slots=True)
class LineNeed:
    """What one line asks for at one place [m].

    `ratio` is the line's worst ratio of exposure to limit for the eye, `density` the optical density
    that brings it to 1; `scales` the EN 207 modes; `alignment` the EN 208 number where it exists.
    """

    line: int
    wavelength_nm: float
    distance_m: float
    ratio: float
    density: float
    scales: list[ScaleNeed]
    alignment: AlignmentNeed | None

    @property
    def number(self) -> int:
        """Scale number that meets every mode and, as transmittance, the rule set's limits."""
        return max([math.ceil(self.density - 1e-9), *(s.wide for s in self.scales)])


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
    """One line against one pair: density needed and offered, modes, what is missing."""

    line: int
    covered: bool
    density_needed: float
    density: float | None
    transmittance: float
    remaining_ratio: float
    modes: list[ModeVerdict]
    missing: list[str]

    @property
    def enough(self) -> bool:
        """Whether nothing is missing for this line."""
        return not self.missing


@dataclass(frozen=True, slots=True)
class PairVerdict:
    """A pair against a laser. `remaining_ratio` adds the lines behind the filter."""

    pair: Pair
    lines: list[LineVerdict]
    remaining_ratio: float
    warnings: list[str]
    alignment_only: bool

    @property
    def sufficient(self) -> bool:
        """Whether every line is covered strongly enough and their sum stays within the limit."""
        return not self.alignment_only and all(v.enough for v in self.lines) and self.remaining_ratio <= 1.0


def _line_ratios(evaluation: Evaluation, ratio: Floats) -> Floats:
    """Worst eye ratio of each line."""
    worst = np.zeros(evaluation.lines.count)
    np.maximum.at(worst, evaluation.eye.criteria.line, ratio)
    return worst


def line_needs(
    evaluation: Evaluation, ratio: Floats, distance_m: float, tables: EyewearTables
) -> list[LineNeed]:
    """Needs of every line of one laser; `ratio` are its eye criteria's ratios at a distance [m]."""
    lines = evaluation.lines
    return [
        LineNeed(
            line=k,
            wavelength_nm=float(lines.wavelength_nm[k]),
            distance_m=distance_m,
            ratio=float(worst),
            density=max(0.0, math.log10(worst)) if worst > 0.0 else 0.0,
            scales=scale_needs(lines, k, distance_m, tables),
            alignment=alignment_need(lines, k, distance_m, tables),
        )
        for k, worst in enumerate(_line_ratios(evaluation, ratio))
    ]


def judge(pair: Pair, evaluation: Evaluation, ratio: Floats, needs: list[LineNeed]) -> PairVerdict:
    """Whether a pair will do against every line, at the place for which `ratio` and `needs` hold."""
    verdicts = [_line(pair, need) for need in needs]
    passed = np.array([v.transmittance for v in verdicts])
    remaining = _remaining(evaluation, evaluation.eye, ratio, passed)
    marks = [m for c in pair.coverages for m in c.marks]
    alignment = any(m.scale == "RB" for m in marks)
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
    if any(c.density is not None and not c.marks for c in pair.coverages):
        warnings.append(
            "An optical density alone says how much the filter lets through, not whether filter and frame "
            "withstand the beam."
        )
    if any(m.scale == "AB" for m in marks):
        warnings.append("AB numbers belong to screens, not to eyewear.")
    if remaining > 1.0 and all(v.enough for v in verdicts) and not alignment:
        warnings.append(
            "Each line alone is covered, but together they still exceed the limit behind the filter."
        )
    return PairVerdict(pair, verdicts, remaining, warnings, alignment)


def _remaining(evaluation: Evaluation, result: TargetResult, ratio: Floats, passed: Floats) -> float:
    """Worst summed ratio behind a filter with a transmittance per line."""
    kind = evaluation.rules.additivity[result.criteria.row]
    worst: dict[tuple[int, int], float] = {}
    for name, line, value in zip(kind.tolist(), result.criteria.line.tolist(), ratio.tolist(), strict=True):
        worst[name, line] = max(worst.get((name, line), 0.0), value * float(passed[line]))
    sums: dict[int, float] = {}
    for (name, _), value in worst.items():
        sums[name] = sums.get(name, 0.0) + value
    return max(sums.values())


def _line(pair: Pair, need: LineNeed) -> LineVerdict:
    """One line: the strongest of the coverages that hold its wavelength."""
    holding = [c for c in pair.coverages if c.from_nm <= need.wavelength_nm <= c.to_nm]
    marks = [m for c in holding for m in c.marks if _holds(m, c, need.wavelength_nm)]
    stated = [c.density for c in holding if c.density is not None]
    # A mark LBn promises a transmittance of at most 10^-n.
    densities = stated + [float(m.number) for m in marks if m.scale == "LB"]
    density = max(densities) if densities else None
    transmittance = 10.0**-density if density is not None else 1.0
    missing = []
    modes = []
    aligning = [m.number for m in marks if m.scale == "RB"]
    if aligning and need.density > 0.0:
        missing.append(_alignment_text(max(aligning), need.alignment))
    if density is None and need.density > 0.0 and not aligning:
        missing.append(f"{need.wavelength_nm:g} nm is not covered")
    elif density is not None and density < need.density - 1e-9:
        missing.append(
            f"optical density {density:g} where {_up(need.density)} is needed: "
            f"{_up(need.density - density)} short"
        )
    if marks and any(m.scale == "LB" for m in marks):
        for scale in need.scales:
            marked = max((m.number for m in marks if m.scale == "LB" and scale.mode in m.modes), default=None)
            verdict = ModeVerdict(scale.mode, scale.wide, marked)
            modes.append(verdict)
            if not verdict.enough:
                missing.append(_mode_text(scale, marked))
    return LineVerdict(
        need.line,
        density is not None,
        need.density,
        density,
        transmittance,
        need.ratio * transmittance,
        modes,
        missing,
    )


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


def _mode_text(scale: ScaleNeed, marked: int | None) -> str:
    have = "no mark" if marked is None else f"LB{marked}"
    if scale.wide > 10:
        return f"mode {scale.mode}: {have}; the beam is beyond LB10, no scale number will do"
    text = f"mode {scale.mode}: {have} where LB{scale.wide} is needed"
    if marked is not None and marked >= scale.number:
        return f"{text} for so wide a beam (LB{scale.number} without the remembered size factor)"
    return text if marked is None else f"{text}: {scale.wide - marked} short"


def _up(value: float) -> str:
    """Two decimals, rounded up."""
    return f"{math.ceil(value * 100 - 1e-9) / 100:g}"


def ranked(verdicts: list[PairVerdict]) -> list[int]:
    """Indices of the pairs: sufficient first, then the most light, then in the order given."""

    def key(k: int) -> tuple[bool, float, int]:
        light = verdicts[k].pair.luminous_transmittance
        return not verdicts[k].sufficient, 0.0 if light is None else -light, k

    return sorted(range(len(verdicts)), key=key)
