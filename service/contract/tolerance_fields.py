"""Which figures of an evaluation may carry a tolerance, and the box they span."""

from __future__ import annotations

import copy
from dataclasses import dataclass
from typing import Any

import numpy as np
from pydantic import ValidationError

from service.assess.lines import Lines
from service.assess.spread import OF_BEAM, Knob, Nominal
from service.contract.beam import LEAST_MM, Beam, FibreMultimode, FibreSingleMode
from service.contract.beam_only import refuse_aid, refuse_end
from service.contract.bounds_medium import refuse
from service.contract.problem import InvalidRequest, invalid_request
from service.contract.request import EvaluationRequest, Line, Train
from service.contract.tolerance import Tolerance, ToleranceRequest

__all__ = ["Spread", "corners_at_most", "draws_of", "nominal_lines", "set_field", "spreads"]

#: A normal tolerance covers two standard deviations and is judged out to three.
COVERED, JUDGED = 2.0, 3.0
EMISSIONS = {"power_w": "emitted", "energy_j": "emitted", "average_power_w": "average_power_w"}
PLAIN = ("pulse_s", "rate_hz")
#: Figures of a fibre end, and those of its beam that they turn.
FIBRE = {
    "mode_field_diameter_um": ("mode_field",),
    "core_diameter_um": ("diameter_x", "diameter_y"),
    "numerical_aperture": ("divergence_x", "divergence_y"),
}
#: Processor time of one line by shape [us], how much longer several waists take, and how much longer axes
#: that have a waist each; measured.
ROUND_US, ELLIPTICAL_US, WAISTS, ASTIGMATIC = 5.0, 300.0, 16.0, 70.0
#: Time for draws nobody asked for, for those somebody did, and for corners [us].
USUAL_US, MOST_US, CORNERS_US = 1e7, 6e7, 2e6
USUAL_DRAWS, LEAST_DRAWS = 100_000, 100
#: So many corners are judged however long it takes.
LEAST_CORNERS = 250
ALLOWED = (
    "exposure_s, or of a line wavelength_nm, subtense_mrad, emission.power_w, emission.energy_j, "
    "emission.average_power_w, emission.pulse_s, emission.rate_hz, beam.diameter_mm, beam.divergence_mrad "
    "(also one axis: beam.diameter_mm.0), beam.waist_m, and of a fibre end beam.mode_field_diameter_um, "
    "beam.core_diameter_um, beam.numerical_aperture"
)


@dataclass(frozen=True, slots=True)
class Spread:
    """One toleranced field: the figures it turns, its value, and the box that is judged.

    `scale` of each figure: a field that stands for both axes turns them in proportion.
    `deviation` is the standard deviation of a normal meaning, 0 for a uniform one.
    """

    field: str
    knobs: tuple[tuple[Knob, float], ...]
    value: float
    low: float
    high: float
    deviation: float
    centre: float


def _knobs(evaluation: EvaluationRequest, field: str) -> tuple[tuple[tuple[Knob, float], ...], float] | None:
    """The figures behind a field and its value; None where the field carries no tolerance."""
    parts = field.split(".")
    if field == "exposure_s":
        return None if evaluation.exposure_s is None else (((Knob(-1, field), 1.0),), evaluation.exposure_s)
    if len(parts) < 3 or parts[0] != "lines" or not parts[1].isdecimal():
        return None
    number = int(parts[1][:6])
    if number >= len(evaluation.lines):
        return None
    line, rest = evaluation.lines[number], parts[2:]
    if rest in (["wavelength_nm"], ["subtense_mrad"]):
        return ((Knob(number, rest[0]), 1.0),), getattr(line, rest[0])
    if rest[0] == "emission" and len(rest) == 2 and rest[1] in (*EMISSIONS, *PLAIN):
        value = getattr(line.emission, rest[1], None)
        return None if value is None else (((Knob(number, EMISSIONS.get(rest[1], rest[1])), 1.0),), value)
    return _beam_knobs(line, number, rest[1:]) if rest[0] == "beam" else None


def _beam_knobs(
    line: Line, number: int, rest: list[str]
) -> tuple[tuple[tuple[Knob, float], ...], float] | None:
    """`_knobs` for a field of the beam."""
    beam = line.beam
    if not isinstance(beam, Beam):
        value = getattr(beam, rest[0], None) if len(rest) == 1 and rest[0] in FIBRE else None
        return None if value is None else (tuple((Knob(number, f), 1.0) for f in FIBRE[rest[0]]), value)
    if rest == ["waist_m"]:
        return ((Knob(number, "waist_m"), 1.0),), beam.waist_m
    if not rest or rest[0] not in ("diameter_mm", "divergence_mrad"):
        return None
    pair, stem = getattr(beam, rest[0]), rest[0].partition("_")[0]
    if len(rest) == 2 and rest[1] in ("0", "1"):
        k = int(rest[1])
        return ((Knob(number, f"{stem}_{'xy'[k]}"), 1.0),), pair[k]
    if len(rest) != 1:
        return None
    ratio = pair[1] / pair[0] if pair[0] else 1.0
    return ((Knob(number, f"{stem}_x"), 1.0), (Knob(number, f"{stem}_y"), ratio)), pair[0]


def _box(tolerance: Tolerance, value: float) -> tuple[float, float, float, float]:
    """Low and high end judged, standard deviation (0: uniform) and centre."""
    if tolerance.plus_minus_percent is not None:
        half = abs(value) * tolerance.plus_minus_percent / 100.0
        low, high = value - half, value + half
    elif tolerance.plus_minus is not None:
        low, high = value - tolerance.plus_minus, value + tolerance.plus_minus
    else:
        assert tolerance.low is not None
        assert tolerance.high is not None
        low, high = tolerance.low, tolerance.high
    centre, half = 0.5 * (low + high), 0.5 * (high - low)
    if tolerance.meaning == "uniform":
        return low, high, 0.0, centre
    deviation = half / COVERED
    return centre - JUDGED * deviation, centre + JUDGED * deviation, deviation, centre


def spreads(request: ToleranceRequest) -> list[Spread]:
    """Every tolerance as a box. Raises InvalidRequest naming what cannot be judged with tolerances."""
    refuse_aid(request.evaluation)
    refuse_end(request.evaluation)
    found: list[Spread] = []
    taken: set[Knob] = set()
    for k, tolerance in enumerate(request.tolerances):
        path = f"tolerances.{k}.field"
        known = _knobs(request.evaluation, tolerance.field)
        if known is None:
            raise refuse(
                path,
                tolerance.field,
                ALLOWED,
                "there is no such figure in this evaluation that can carry a tolerance",
                "Name a figure that the evaluation gives.",
            )
        knobs, value = known
        if taken & {knob for knob, _ in knobs}:
            raise refuse(
                path, tolerance.field, "one tolerance for each figure", "this figure has a tolerance already",
                "Remove one of the two.",
            )  # fmt: skip
        low, high, deviation, centre = _box(tolerance, value)
        if not low <= value <= high:
            raise refuse(
                f"tolerances.{k}.low",
                tolerance.low,
                "a range that holds the value",
                f"the value {value:g} lies outside the range that is judged",
                "Widen the range, or correct the value.",
            )
        _not_through_the_bench(request.evaluation, path, tolerance.field, knobs[0][0].figure)
        taken |= {knob for knob, _ in knobs}
        found.append(Spread(tolerance.field, knobs, value, low, high, deviation, centre))
    _check_ends(request, found)
    return found


def _not_through_the_bench(evaluation: EvaluationRequest, path: str, field: str, figure: str) -> None:
    """Refuse figures of which a bench or hazy air could make a worst case between the corners."""
    if evaluation.bench and figure in (*OF_BEAM, "wavelength_nm"):
        raise refuse(
            path,
            field,
            "with a bench: power, energy, durations, rate and subtense",
            "what a bench makes of beam and wavelength may be worst anywhere within the tolerance",
            "Leave the bench out, and enter the beam as it leaves the last element.",
        )
    if evaluation.viewing.visibility_km is not None and figure == "wavelength_nm":
        raise refuse(
            path,
            field,
            "with a visibility: any figure but the wavelength",
            "a longer wavelength passes hazy air better but has higher limits: the worst may lie between",
            "Leave the visibility out: clear air is stricter.",
        )


def set_field(body: dict[str, Any], field: str, value: float) -> None:
    """Set a figure of an evaluation's body, in place; a pair keeps its proportion."""
    *way, last = field.split(".")
    place: Any = body
    for step in way:
        inner = place[int(step)] if isinstance(place, list) else place[step]
        if isinstance(inner, int | float):
            inner = place[step] = [inner, inner]
        place = inner
    if isinstance(place, list):
        place[int(last)] = value
    elif isinstance(place.get(last), list | tuple):
        x, y = place[last]
        place[last] = [value, value * (y / x if x else 1.0)]
    else:
        place[last] = value


def _check_ends(request: ToleranceRequest, found: list[Spread]) -> None:
    """Refuse boxes whose ends an evaluation would refuse."""
    body = request.evaluation.model_dump(mode="json", exclude_none=True)
    for k, spread in enumerate(found):
        for end in (spread.low, spread.high):
            changed = copy.deepcopy(body)
            set_field(changed, spread.field, end)
            try:
                EvaluationRequest.model_validate(changed)
            except ValidationError as error:
                first = invalid_request(error).errors[0]
                raise refuse(
                    f"tolerances.{k}.field",
                    spread.field,
                    first.allowed,
                    f"with its tolerance this figure reaches {end:.6g}: {first.message}",
                    "Give a smaller tolerance, or a range with its ends.",
                ) from None
    _check_waists(request, found)


def _check_waists(request: ToleranceRequest, found: list[Spread]) -> None:
    """Refuse combinations in which the beam would be narrower at the exit than it can be."""
    ends = {knob: (s.low * ratio, s.high * ratio) for s in found for knob, ratio in s.knobs}
    for number, line in enumerate(request.evaluation.lines):
        beam = line.beam
        if not isinstance(beam, Beam) or beam.diameter_at != "exit":
            continue
        waist = max(map(abs, ends.get(Knob(number, "waist_m"), (beam.waist_m,) * 2)))
        for k, axis in enumerate("xy"):
            least = ends.get(Knob(number, f"diameter_{axis}"), (beam.diameter_mm[k],) * 2)[0]
            most = ends.get(Knob(number, f"divergence_{axis}"), (beam.divergence_mrad[k],) * 2)[1]
            squared = least**2 - (most * waist) ** 2
            if squared < LEAST_MM**2:
                raise _impossible(number)


def _impossible(number: int) -> InvalidRequest:
    return refuse(
        f"evaluation.lines.{number}.beam",
        None,
        "a beam that is possible at every corner",
        "at a corner of the tolerances the beam is narrower at the exit than divergence and way to the "
        "waist make it there",
        "Give the diameter at the waist, or smaller tolerances.",
    )


def _cost_us(request: ToleranceRequest, behind: Lines) -> float:
    """About how long one laser takes to judge [us]: elliptical beams and several waists take longer.

    `behind`: its lines behind the bench.
    """
    beams, turned = behind.beams, [t.field for t in request.tolerances]
    own = [any(f.startswith(f"lines.{k}.beam.") and f[-2:] in (".0", ".1") for f in turned)
           for k in range(behind.count)]  # fmt: skip
    elliptical = (beams.diameter_x_m != beams.diameter_y_m) | (
        beams.divergence_x_rad != beams.divergence_y_rad
    )
    shape = np.where(elliptical | own, ELLIPTICAL_US, ROUND_US)
    astigmatic = beams.first_waist_m() != beams.last_waist_m()
    cost = float(np.where(astigmatic, ELLIPTICAL_US * ASTIGMATIC, shape).sum())
    moving = any(f.endswith(".waist_m") for f in turned)
    apart = behind.count > 1 and (len(np.unique(beams.last_waist_m())) > 1 or moving)
    hazy = bool((beams.uneven() & ~astigmatic).any()) or (moving and beams.extinction_per_m.any())
    return cost * (WAISTS if apart or hazy else 1.0)


def draws_of(request: ToleranceRequest, behind: Lines) -> int:
    """How many draws to take. Raises InvalidRequest where more are asked for than a request may take."""
    cost = _cost_us(request, behind)
    if request.draws is None:
        return int(min(USUAL_DRAWS, USUAL_US / cost))
    most = max(LEAST_DRAWS, int(MOST_US / cost))
    if request.draws > most:
        raise refuse(
            "draws",
            request.draws,
            f"{LEAST_DRAWS} to {most} for this laser",
            "so many draws of elliptical beams or several waists take too long for one request",
            "Ask for fewer draws, or leave the number out.",
        )
    return request.draws


def corners_at_most(request: ToleranceRequest, behind: Lines, most: int) -> int:
    """How many corners to judge, `most` where they are quick."""
    return int(min(most, max(LEAST_CORNERS, CORNERS_US / _cost_us(request, behind))))


def nominal_lines(evaluation: EvaluationRequest) -> list[Nominal]:
    """The lines as given."""
    lines = []
    for line in evaluation.lines:
        emission, average = line.emission, None
        if isinstance(emission, Train):
            emitted, average = emission.pulse_energy_j, emission.average_power_w
        else:
            emitted = emission.power_w if emission.mode == "cw" else emission.energy_j
        lines.append(Nominal(emitted, average, *_shape(line.beam)))
    return lines


def _shape(
    beam: Beam | FibreSingleMode | FibreMultimode,
) -> tuple[tuple[float, float], tuple[float, float], float, bool, bool]:
    """What `Nominal` holds of a beam: diameters, divergences, waist, at the exit, single mode."""
    if isinstance(beam, Beam):
        return beam.diameter_mm, beam.divergence_mrad, beam.waist_m, beam.diameter_at == "exit", False
    if isinstance(beam, FibreSingleMode):
        return (beam.mode_field_diameter_um,) * 2, (1.0, 1.0), 0.0, False, True
    return (beam.core_diameter_um,) * 2, (beam.numerical_aperture,) * 2, 0.0, False, False
