"""Optical density, scale numbers, pairs of eyewear and windows in the answer."""

from __future__ import annotations

import numpy as np
from pydantic import Field

from service.assess.evaluate import Evaluation
from service.assess.marking import parse_marking
from service.assess.protection import Coverage, LineNeed, Pair, PairVerdict, judge, line_needs, ranked
from service.assess.scales import scale_needs, spot_area_m2
from service.assess.viewing import ratios_at
from service.contract.request import EvaluationRequest, Eyewear, Window
from service.contract.result import Known, Model
from service.files import DATA
from service.rules.eyewear import EyewearTables, eyewear_tables

__all__ = ["LineProtection", "Protection", "protection_of"]

SIZE_REMARK = (
    "Wide beams strain a filter more than the scale table of EN 207 says. The size factor is from memory and "
    "the remembered forms conflict; the largest of them, d^1.7 with d in mm held at 15 mm, is used for mode "
    "D beside the plain table number (stricter). Take the exact one from the standard or the maker."
)
GROUP_REMARK = "The grouping times of pulses in EN 207 are from memory with low confidence."


class ScaleNumber(Model):
    """The EN 207 scale number that one mode asks for."""

    mode: str
    value: float = Field(description="Irradiance or radiant exposure that counts, pulse number included.")
    unit: str
    pulses: float
    scale_number: int = Field(description="LB of the scale table; 0 = none needed, above 10 = beyond it.")
    size_factor: float
    scale_number_wide_beam: int = Field(description="With the size factor: the number that is asked for.")
    source: str
    known: Known


class AlignmentNumber(Model):
    """The EN 208 scale number for aligning a visible beam; null beyond RB5."""

    value: float
    unit: str
    scale_number: int | None


class AtPlace(Model):
    """What one line needs at one place."""

    distance_m: float
    hazard_ratio: float
    optical_density: float
    transmittance: float = Field(
        description="Highest transmittance that still protects: 10^-optical_density."
    )
    scale_numbers: list[ScaleNumber]
    scale_number: int = Field(
        description="LB that meets every mode and, as transmittance, the rule set's limits."
    )
    scale_table_too_weak: bool = Field(
        description="True where the scale table alone asks for less than the rule set's limits need."
    )
    alignment: AlignmentNumber | None


class LineProtection(Model):
    """What one line needs: at the most hazardous place and at the viewing distance."""

    line: int
    wavelength_nm: float
    worst_place: AtPlace
    at_distance: AtPlace | None


class ModeCheck(Model):
    """One mode: the scale number needed and the one marked (null: not marked)."""

    mode: str
    needed: int
    marked: int | None
    enough: bool


class LineCheck(Model):
    """One line against a pair."""

    line: int
    wavelength_nm: float
    covered: bool
    enough: bool
    optical_density_needed: float
    optical_density: float | None
    remaining_ratio: float
    modes: list[ModeCheck]
    missing: list[str]


class PairCheck(Model):
    """Whether a pair will do, at the most hazardous place."""

    name: str
    sufficient: bool
    sufficient_at_distance: bool | None
    rank: int
    alignment_only: bool
    luminous_transmittance: float | None
    remaining_ratio: float
    lines: list[LineCheck]
    warnings: list[str]


class WindowCheck(Model):
    """A window, enclosure wall or screen at its distance."""

    name: str
    distance_m: float
    hazard_ratio: float
    optical_density_needed: float
    optical_density: float | None
    remaining_ratio: float | None
    sufficient: bool | None
    irradiance_w_m2: float = Field(description="Average irradiance that it must withstand.")
    radiant_exposure_j_m2: float | None = Field(description="Of the strongest pulse on the window.")
    screen_number: int = Field(
        description="AB of EN 12254 that the beam asks for; above 10 = beyond the scale."
    )
    screen_scope: str


class Protection(Model):
    """Everything about protection."""

    lines: list[LineProtection]
    eyewear: list[PairCheck] = Field(description="In the order of the request; rank 1 is the best.")
    windows: list[WindowCheck]
    remarks: list[str]


def protection_of(request: EvaluationRequest, evaluation: Evaluation) -> Protection:
    """Needs of every line, verdict on every pair and window of one laser."""
    tables = eyewear_tables(DATA)
    eye = evaluation.eye
    place = float(eye.place_m[0])
    worst = line_needs(evaluation, eye.hazard_ratio, place, tables)
    distance = request.viewing.distance_m
    there: list[LineNeed] | None = None
    ratio_there = eye.hazard_ratio
    if distance is not None:
        ratio_there, _ = ratios_at(evaluation, eye, np.array([distance]))
        there = line_needs(evaluation, ratio_there, distance, tables)
    pairs = [_pair(p) for p in request.eyewear]
    verdicts = [judge(p, evaluation, eye.hazard_ratio, worst) for p in pairs]
    at_distance = [judge(p, evaluation, ratio_there, there).sufficient for p in pairs] if there else None
    order = ranked(verdicts)
    return Protection(
        lines=[
            LineProtection(
                line=n.line,
                wavelength_nm=n.wavelength_nm,
                worst_place=_place(n, tables),
                at_distance=None if there is None else _place(there[n.line], tables),
            )
            for n in worst
        ],
        eyewear=[
            _pair_check(v, worst, order.index(k) + 1, None if at_distance is None else at_distance[k])
            for k, v in enumerate(verdicts)
        ],
        windows=[_window(w, evaluation, tables) for w in request.windows],
        remarks=_remarks(worst),
    )


def _remarks(needs: list[LineNeed]) -> list[str]:
    remarks = []
    if any(s.size_factor > 1.0 for n in needs for s in n.scales):
        remarks.append(SIZE_REMARK)
    if any(s.pulses > 1.0 for n in needs for s in n.scales):
        remarks.append(GROUP_REMARK)
    return remarks


def _pair(pair: Eyewear) -> Pair:
    coverages = tuple(
        Coverage(
            r.from_nm,
            r.to_nm,
            r.optical_density,
            tuple(parse_marking(r.marking)) if r.marking is not None else (),
        )
        for r in pair.ranges
    )
    return Pair(pair.name, coverages, pair.luminous_transmittance)


def _place(need: LineNeed, tables: EyewearTables) -> AtPlace:
    table = max((s.wide for s in need.scales), default=0)
    alignment = need.alignment
    return AtPlace(
        distance_m=need.distance_m,
        hazard_ratio=need.ratio,
        optical_density=need.density,
        transmittance=10.0**-need.density,
        scale_numbers=[
            ScaleNumber(
                mode=s.mode,
                value=s.value,
                unit="W/m2" if s.row.quantity == "E" else "J/m2",
                pulses=s.pulses,
                scale_number=s.number,
                size_factor=s.size_factor,
                scale_number_wide_beam=s.wide,
                source=tables.source_text(s.row),
                known="read" if s.row.known == "read" else "memory",
            )
            for s in need.scales
        ],
        scale_number=need.number,
        scale_table_too_weak=table < need.density - 1e-9,
        alignment=None
        if alignment is None
        else AlignmentNumber(value=alignment.value, unit=alignment.unit, scale_number=alignment.number),
    )


def _pair_check(
    verdict: PairVerdict, needs: list[LineNeed], rank: int, at_distance: bool | None
) -> PairCheck:
    return PairCheck(
        name=verdict.pair.name,
        sufficient=verdict.sufficient,
        sufficient_at_distance=at_distance,
        rank=rank,
        alignment_only=verdict.alignment_only,
        luminous_transmittance=verdict.pair.luminous_transmittance,
        remaining_ratio=verdict.remaining_ratio,
        lines=[
            LineCheck(
                line=v.line,
                wavelength_nm=needs[v.line].wavelength_nm,
                covered=v.covered,
                enough=v.enough,
                optical_density_needed=v.density_needed,
                optical_density=v.density,
                remaining_ratio=v.remaining_ratio,
                modes=[
                    ModeCheck(mode=m.mode, needed=m.needed, marked=m.marked, enough=m.enough) for m in v.modes
                ],
                missing=v.missing,
            )
            for v in verdict.lines
        ],
        warnings=verdict.warnings,
    )


def _window(window: Window, evaluation: Evaluation, tables: EyewearTables) -> WindowCheck:
    """A window: density from the rule set's limits, strength from the scale of screens."""
    _, worst = ratios_at(evaluation, evaluation.eye, np.array([window.distance_m]))
    ratio = float(worst[0])
    density = window.optical_density
    lines = evaluation.lines
    irradiance, pulse, mean, energy, numbers = 0.0, None, 0.0, 0.0, [0]
    for k in range(lines.count):
        area, _ = spot_area_m2(lines, k, window.distance_m)
        emitted, mode = float(lines.emitted[k]), int(lines.mode[k])
        power = emitted if mode == 0 else emitted * float(lines.rate_hz[k]) if mode == 2 else 0.0
        irradiance, mean = irradiance + power / area, mean + power
        if mode:
            pulse, energy = max(pulse or 0.0, emitted / area), max(energy, emitted)
        numbers += [s.number for s in scale_needs(lines, k, window.distance_m, tables)]
    use = tables.use
    inside = mean <= use["en12254_mean_power"].value and energy <= use["en12254_pulse_energy"].value
    scope = "within" if inside else "beyond"
    return WindowCheck(
        name=window.name,
        distance_m=window.distance_m,
        hazard_ratio=ratio,
        optical_density_needed=max(0.0, float(np.log10(ratio))) if ratio > 0.0 else 0.0,
        optical_density=density,
        remaining_ratio=None if density is None else ratio * 10.0**-density,
        sufficient=None if density is None else ratio * 10.0**-density <= 1.0,
        irradiance_w_m2=irradiance,
        radiant_exposure_j_m2=pulse,
        screen_number=max(numbers),
        screen_scope=f"{scope} the scope of EN 12254 (mean power up to 100 W, single pulse up to 30 J; from "
        f"memory); screens are tested for {use['en12254_test_time'].value:g} s, eyewear for "
        f"{use['en207_test_time'].value:g} s",
    )
