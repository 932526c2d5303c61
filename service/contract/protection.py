"""Optical density, scale numbers, pairs of eyewear and windows in the answer."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from service.assess.aid import Aid
from service.assess.evaluate import Evaluation, optical_density
from service.assess.looks import Look, both, worse
from service.assess.marking import parse_marking
from service.assess.protection import (
    Coverage,
    LineNeed,
    Pair,
    PairVerdict,
    ranked,
)
from service.assess.scales import SLACK
from service.assess.screens import screen_load
from service.assess.steps import number_up
from service.assess.viewing import ratios_from, sum_of_lines
from service.assess.working_protection import protection_steps
from service.contract.request import EvaluationRequest, Eyewear, Window
from service.contract.result import Known, Model, WorkingStep, step_model
from service.files import DATA
from service.rules.eyewear import EyewearTables, eyewear_tables
from service.rules.ruleset import TARGETS

__all__ = ["LineProtection", "Protection", "protection_of"]

SIZE_REMARK = (
    "Wide beams strain a filter more than the scale table of EN 207 says. The size factor is from memory and "
    "the remembered forms conflict; the largest of them, d^1.7 with d in mm held at 15 mm, is used for mode "
    "D beside the plain table number (stricter). Take the exact one from the standard or the maker."
)
HEAT_REMARK = (
    "Several lines load the same filter. Those of one band and mode are added for the scale number that is "
    "asked for (stricter; no source that was read says how they add)."
)
ALIGNMENT_REMARK = (
    "EN 208 rests on limits older than the rule set's: behind the alignment number named here up to {} "
    "times the rule set's limit can remain."
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
    hazard_ratio: float = Field(description="Worst exposure / limit among the criteria of this mode.")
    scale_number_needed: int = Field(
        description="LB that meets the scale table with the size factor and, as transmittance, the limits."
    )


class AlignmentNumber(Model):
    """The EN 208 scale number for aligning a visible beam; null beyond RB5."""

    value: float
    unit: str
    scale_number: int | None
    remaining_ratio: float | None = Field(
        description="Exposure / limit that can remain behind this number: above 1 EN 208 asks too little."
    )
    known: Known


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
    working: list[WorkingStep]


class LineProtection(Model):
    """What one line needs: at the most hazardous place and at the viewing distance."""

    line: int
    wavelength_nm: float
    worst_place: AtPlace
    at_distance: AtPlace | None
    behind_aid: AtPlace | None = Field(
        description="For an eye behind viewing.aid at the most hazardous place; null without one. The load "
        "is that of a beam narrowed by the magnification, an upper bound."
    )


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
    """Whether a pair will do, each line at its most hazardous place, with viewing.aid behind it too."""

    name: str
    sufficient: bool = Field(description="Dense enough, shown to withstand the beam, not for alignment only.")
    dense_enough: bool = Field(description="Behind it every line, and their sum, is within the limit.")
    resistance_shown: bool = Field(description="Marks show that it withstands every line that asks for it.")
    sufficient_at_distance: bool | None
    rank: int
    alignment_only: bool
    luminous_transmittance: float | None
    remaining_ratio: float
    lines: list[LineCheck]
    warnings: list[str]


class WindowCheck(Model):
    """A window, enclosure wall or screen at its distance.

    The exposure is the worst of eye and skin at or behind it, each line at its own worst place (an upper
    bound), with viewing.aid the worse of both eyes.
    """

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


def protection_of(
    request: EvaluationRequest, evaluation: Evaluation, aided: tuple[Evaluation, Aid] | None = None
) -> Protection:
    """Needs of every line, verdict on every pair and window of one laser.

    `aided`: the evaluation behind an optical aid, and the aid. Pairs and windows must then do for
    the bare eye and for the eye behind it.
    """
    tables, distance = eyewear_tables(DATA), request.viewing.distance_m
    bare = Look.of(evaluation, distance, tables)
    behind = None if aided is None else Look.of(aided[0], distance, tables, aided[1])
    pairs = [_pair(p) for p in request.eyewear]
    verdicts = [worse(bare.judge(p), None if behind is None else behind.judge(p)) for p in pairs]
    there = [both(bare.enough_there(p), None if behind is None else behind.enough_there(p)) for p in pairs]
    order = ranked(verdicts)
    evaluations = [evaluation] if aided is None else [evaluation, aided[0]]
    return Protection(
        lines=[
            LineProtection(
                line=n.line,
                wavelength_nm=n.wavelength_nm,
                worst_place=_place(n, evaluation, tables),
                at_distance=None if bare.there is None else _place(bare.there[n.line], bare.seen, tables),
                behind_aid=None
                if behind is None
                else _place(behind.worst[n.line], behind.evaluation, tables),
            )
            for n in bare.worst
        ],
        eyewear=[_pair_check(v, bare.worst, order.index(k) + 1, there[k]) for k, v in enumerate(verdicts)],
        windows=[_window(w, evaluations, tables) for w in request.windows],
        remarks=_remarks(bare.worst),
    )


def _remarks(needs: list[LineNeed]) -> list[str]:
    remarks = []
    if any(s.size_factor > 1.0 for n in needs for s in n.scales):
        remarks.append(SIZE_REMARK)
    if len(needs) > 1 and any(n.strengths != [s.wide for s in n.scales] for n in needs):
        remarks.append(HEAT_REMARK)
    remaining = [a.remaining_ratio for a in map(_alignment, needs) if a and a.remaining_ratio]
    if max(remaining, default=0.0) > 1.0 + SLACK:
        remarks.append(ALIGNMENT_REMARK.format(number_up(max(remaining))))
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


def _alignment(need: LineNeed) -> AlignmentNumber | None:
    found = need.alignment
    if found is None:
        return None
    remaining = None if found.number is None else need.ratio * 10.0**-found.number
    return AlignmentNumber(
        value=found.value,
        unit=found.unit,
        scale_number=found.number,
        remaining_ratio=remaining,
        known="memory",
    )


def _place(need: LineNeed, evaluation: Evaluation, tables: EyewearTables) -> AtPlace:
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
                known="memory" if s.uncertain else "read",
                hazard_ratio=ratio,
                scale_number_needed=number,
            )
            for s, ratio, number in zip(need.scales, need.ratios, need.numbers, strict=True)
        ],
        scale_number=need.number,
        scale_table_too_weak=need.table_too_weak,
        alignment=_alignment(need),
        working=[step_model(s) for s in protection_steps(need, evaluation.lines, tables)],
    )


def _pair_check(
    verdict: PairVerdict, needs: list[LineNeed], rank: int, at_distance: bool | None
) -> PairCheck:
    return PairCheck(
        name=verdict.pair.name,
        sufficient=verdict.sufficient,
        dense_enough=verdict.dense_enough,
        resistance_shown=verdict.resistance_shown,
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


def _ratio_behind(evaluation: Evaluation, target: str, places: NDArray[np.float64]) -> float:
    """Worst ratio at or behind the place [m] of each line."""
    if evaluation.moving is not None:
        return evaluation.moving.worst_from(target, float(places.min()))
    result = evaluation.target(target)
    return sum_of_lines(evaluation, result, ratios_from(evaluation, result, places))


def _window(window: Window, evaluations: list[Evaluation], tables: EyewearTables) -> WindowCheck:
    """A window: density from the rule set's limits, strength from the scale of screens."""
    evaluation = evaluations[0]
    places = np.maximum(window.distance_m, evaluation.lines.beams.nearest_m)
    ratio = max(_ratio_behind(e, target, places) for e in evaluations for target in TARGETS)
    load = screen_load(evaluation.lines, window.distance_m, tables)
    remaining = None if window.optical_density is None else ratio * 10.0**-window.optical_density
    use = tables.use
    return WindowCheck(
        name=window.name,
        distance_m=window.distance_m,
        hazard_ratio=ratio,
        optical_density_needed=float(optical_density(np.array(ratio))),
        optical_density=window.optical_density,
        remaining_ratio=remaining,
        sufficient=None if remaining is None else remaining <= 1.0 + SLACK,
        irradiance_w_m2=load.irradiance_w_m2,
        radiant_exposure_j_m2=load.radiant_exposure_j_m2,
        screen_number=load.number,
        screen_scope=f"{'within' if load.within_scope else 'beyond'} the scope of EN 12254 (mean power up to "
        f"{use['en12254_mean_power'].value:g} W, single pulse up to {use['en12254_pulse_energy'].value:g} J; "
        f"from memory); screens are tested for {use['en12254_test_time'].value:g} s, eyewear for "
        f"{use['en207_test_time'].value:g} s",
    )
