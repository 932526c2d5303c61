"""Notices: what a careful reader would ask about, above all slips of units."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation
from service.assess.steps import number_up
from service.contract.beam import Beam, FibreMultimode
from service.contract.request import Cw, EvaluationRequest, Line, Pulse, Train
from service.contract.result import Notice
from service.optics.beams import SQRT2
from service.rules.ruleset import TARGETS
from service.rules.tables import Row

__all__ = ["aided_notices", "input_notices", "lasers_with_result_notices", "notices_of"]

#: Above these a value is asked about (common practice, no source).
WIDE_BEAM_MM = 1000.0
WIDE_ANGLE_MRAD = 500.0
STRONG_W = 1e5
FAINT_W = 1e-9
PEAK_W = 1e16
#: The large-area rule of the skin limits beyond 1400 nm starts at this exposed area [m2].
LARGE_AREA_M2 = 0.01


def notices_of(request: EvaluationRequest, evaluation: Evaluation, laser: int) -> list[Notice]:
    """Every notice for one laser of an evaluation, in the order of its fields."""
    members = np.flatnonzero(evaluation.lines.laser == laser)
    found = input_notices(request, evaluation.lines.exposure_s[members].tolist())
    if request.bench:
        found += _focus(evaluation, members)
    found += _result_notices(evaluation, laser, members)
    return found


def input_notices(request: EvaluationRequest, exposure_s: list[float]) -> list[Notice]:
    """The notices that need no result; `exposure_s` of each line of the request [s]."""
    found: list[Notice] = []
    if request.basis == "bound":
        found.append(
            Notice(
                code="bound-not-measured",
                field="basis",
                text="Bound, not measured: the figures entered are upper bounds of what the laser can emit. "
                "Measure it before anything is relaxed because of them.",
            )
        )
    for number, (line, seconds) in enumerate(zip(request.lines, exposure_s, strict=True)):
        found += _line_notices(f"lines.{number}", line, seconds)
    return found


def aided_notices(aided: Evaluation | None) -> Iterator[Notice]:
    """What a reader must know of the eye behind an optical aid."""
    if aided is not None and np.isinf(aided.eye.far_m[0]):
        yield Notice(
            code="unbounded",
            field="viewing.aid",
            text="For the eye behind the optical aid the beam never falls below its limit: there is no "
            "hazard distance.",
        )


def _line_notices(path: str, line: Line, exposure_s: float) -> Iterator[Notice]:
    emission = line.emission
    yield from _beam_notices(path, line)
    if isinstance(emission, Cw):
        if not FAINT_W <= emission.power_w <= STRONG_W:
            yield Notice(
                code="unusual-power",
                field=f"{path}.emission.power_w",
                text=f"{emission.power_w:g} W is unusual for a continuous beam. The field is in watts: "
                "5 mW is 0.005.",
            )
        return
    if emission.pulse_s > exposure_s:
        yield Notice(
            code="pulse-longer-than-exposure",
            field=f"{path}.emission.pulse_s",
            text=f"The pulse ({emission.pulse_s:g} s) lasts longer than the exposure ({exposure_s:g} s). "
            "The whole pulse is judged, which is stricter.",
        )
    energy = emission.energy_j if isinstance(emission, Pulse) else emission.pulse_energy_j
    if energy / emission.pulse_s > PEAK_W:
        yield Notice(
            code="unusual-peak-power",
            field=f"{path}.emission.pulse_s",
            text=f"The peak power comes to {energy / emission.pulse_s:.3g} W. Check energy and duration.",
        )
    if isinstance(emission, Train):
        yield from _train_notices(path, emission, energy, exposure_s)


def _train_notices(path: str, emission: Train, energy_j: float, exposure_s: float) -> Iterator[Notice]:
    duty = emission.pulse_s * emission.rate_hz
    if duty > 1.0:
        yield Notice(
            code="duty-cycle-above-one",
            field=f"{path}.emission.pulse_s",
            text=f"Pulse duration x rate is {duty:.3g}: the pulses would overlap. Check the units of both.",
        )
        name = "average_power_w" if emission.average_power_w is not None else "energy_j"
        yield Notice(
            code="average-power-exceeds-peak",
            field=f"{path}.emission.{name}",
            text=f"The average power ({energy_j * emission.rate_hz:.3g} W) exceeds the peak power "
            f"({energy_j / emission.pulse_s:.3g} W), which no pulse train can do.",
        )
    if emission.rate_hz * exposure_s < 1.0:
        yield Notice(
            code="less-than-one-pulse",
            field=f"{path}.emission.rate_hz",
            text=f"Fewer than one pulse falls into {exposure_s:g} s; one whole pulse is judged.",
        )


def _beam_notices(path: str, line: Line) -> Iterator[Notice]:
    beam = line.beam
    if isinstance(beam, FibreMultimode):
        yield Notice(
            code="fibre-cone",
            field=f"{path}.beam.numerical_aperture",
            text="The printed numerical aperture is the widest cone that the fibre guides. Light launched "
            "in a narrower one, above all into a short fibre, leaves in a narrower one and reaches farther: "
            "measure the cone that leaves, or enter the smallest that can occur.",
        )
    if not isinstance(beam, Beam):
        return
    narrower = 1.0 if beam.profile == "tophat" or beam.level == "1/e2" else SQRT2
    for diameter, divergence in {*zip(beam.waist_diameters_mm(), beam.divergence_mrad, strict=True)}:
        least = 4e-3 * line.wavelength_nm / (np.pi * diameter * narrower) / narrower
        if 0.0 < divergence < least * (1.0 - 1e-3):
            yield Notice(
                code="below-diffraction-limit",
                field=f"{path}.beam.divergence_mrad",
                text=f"{divergence:g} mrad is below the diffraction limit of {least:.3g} mrad for a waist of "
                f"{diameter:g} mm at {line.wavelength_nm:g} nm (4 lambda / (pi d) for 1/e2 values). No beam "
                "spreads less: check both values and whether they are half or full angles.",
            )
    if 0.0 in beam.divergence_mrad:
        yield Notice(
            code="zero-divergence",
            field=f"{path}.beam.divergence_mrad",
            text="No beam has zero divergence. Without spread the distance is the longest that can be, or "
            "there is none; enter the divergence of the data sheet or the diffraction limit.",
        )
    if max(beam.divergence_mrad) > WIDE_ANGLE_MRAD:
        yield Notice(
            code="wide-angle",
            field=f"{path}.beam.divergence_mrad",
            text=f"{max(beam.divergence_mrad):g} mrad is a wide cone. The beam is taken to spread in "
            "proportion to the angle, which is stricter than its tangent. The field is in milliradians: "
            "1 degree is 17.45.",
        )
    if max(beam.diameter_mm) > WIDE_BEAM_MM:
        yield Notice(
            code="beam-wider-than-a-metre",
            field=f"{path}.beam.diameter_mm",
            text=f"The beam is {max(beam.diameter_mm) / 1000:g} m wide. The field is in millimetres.",
        )
    if beam.waist_m > 0.0:
        yield Notice(
            code="waist-downstream",
            field=f"{path}.beam.waist_m",
            text=f"The waist lies {beam.waist_m:g} m downstream of the exit and is {_across(beam)} mm wide. "
            "The beam is most hazardous there, not at the exit.",
        )


def _across(beam: Beam) -> str:
    """Diameters at the waist [mm] as text."""
    x, y = beam.waist_diameters_mm()
    return f"{x:.4g}" if x == y else f"{x:.4g} x {y:.4g}"


def lasers_with_result_notices(evaluation: Evaluation) -> NDArray[np.bool_]:
    """Which lasers of a batch may have a notice beyond `input_notices`: none has where this is False."""
    rules, lines, pulses = evaluation.rules, evaluation.lines, evaluation.exposures
    repetition = np.array([*_uncertain(rules.repetition.rows), False])
    doubtful = np.zeros(lines.lasers, dtype=bool)
    for target in TARGETS:
        result = evaluation.target(target)
        criteria = result.criteria
        uncertain = np.array(_uncertain(rules.rules.limits))[criteria.row]
        uncertain |= repetition[pulses.c_p_row[criteria.exposure]]
        doubtful[lines.laser[criteria.line[uncertain]]] = True
        doubtful |= np.isinf(result.far_m)
    return doubtful | _large_area(evaluation)


def _uncertain(rows: Sequence[Row]) -> list[bool]:
    return [row.note.startswith("uncertain") for row in rows]


def _result_notices(evaluation: Evaluation, laser: int, members: np.ndarray) -> Iterator[Notice]:
    rules = evaluation.rules.rules
    told: set[tuple[int, str]] = set()
    for target in TARGETS:
        result = evaluation.target(target)
        if np.isinf(result.far_m[laser]):
            yield Notice(
                code="unbounded",
                field=None,
                text=f"For the {target} the beam never falls below its limit: there is no hazard distance.",
            )
        criteria = np.arange(*np.searchsorted(result.criteria.line, [members[0], members[-1] + 1]))
        for k in criteria:
            row = rules.limits[result.criteria.row[k]]
            number = int(evaluation.exposures.c_p_row[result.criteria.exposure[k]])
            rows = [row] if number < 0 else [row, evaluation.rules.repetition.rows[number]]
            line = int(result.criteria.line[k] - members[0])
            for uncertain in (r for r in rows if r.note.startswith("uncertain")):
                if (line, uncertain.note) not in told:
                    told.add((line, uncertain.note))
                    text = f"{rules.title}, row {uncertain.row}: {uncertain.note}."
                    yield Notice(code="uncertain-value", field=f"lines.{line}", text=text)
    if _large_area(evaluation)[laser]:
        yield _large_area_notice(evaluation, laser)


def _focus(evaluation: Evaluation, members: np.ndarray) -> Iterator[Notice]:
    """A focus behind the last element of the bench: where, and how small."""
    beams = evaluation.lines.beams.take(members)
    for number, waists in enumerate(zip(*(axis[2] for axis in beams.axes()), strict=True)):
        if max(waists) > 0.0:
            sizes = sorted({f"{float(axis[0][number]) * 1e3:.3g} mm" for axis in beams.axes()})
            places = sorted({f"{max(0.0, float(z)):.4g} m" for z in waists})
            yield Notice(
                code="external-focus",
                field=f"lines.{number}.beam",
                text=f"The beam comes to a focus at {' and '.join(places)} behind the last element, "
                f"{' and '.join(sizes)} wide (1/e). It is most hazardous there; both ends of the zone are "
                "told.",
            )


def _large_area(evaluation: Evaluation) -> NDArray[np.bool_]:
    """Lasers for which the skin limits beyond 1400 nm fall, as they do above 100 cm2; that is not applied."""
    result, lines = evaluation.skin, evaluation.lines
    k = result.governing
    line = result.criteria.line[k]
    time = evaluation.exposures.time_s[result.criteria.exposure[k]]
    there = (lines.wavelength_nm[line] >= 1400.0) & (time >= 10.0) & (result.hazard_ratio[k] > 0.1)
    which = np.flatnonzero(there)
    if which.size:
        far = result.far_m[which]
        x, y = lines.beams.take(line[which]).diameters_m(np.where(np.isfinite(far), far, 0.0))
        there[which] = np.pi / 4.0 * x * y > LARGE_AREA_M2
    return there


def _large_area_notice(evaluation: Evaluation, laser: int) -> Notice:
    """How far the skin would be at risk by the lower limit."""
    result = evaluation.skin
    k = int(result.governing[laser])
    line = int(result.criteria.line[k])
    beams = evaluation.lines.beams.take(np.array([line]))
    strength = float(result.criteria.strength[k])
    reach = beams.reach_m(result.criteria.aperture_m[k : k + 1], np.array([0.1 / strength]))[1]
    where = f"out to {number_up(reach[0])} m" if np.isfinite(reach[0]) else "at any distance"
    return Notice(
        code="large-skin-area",
        field=f"lines.{line - int(np.flatnonzero(evaluation.lines.laser == laser)[0])}",
        text="Where more than 100 cm2 of skin is exposed beyond 1400 nm for longer than 10 s, the published "
        "skin limit falls from 1000 W/m2 to as little as 100 W/m2 (from memory). That rule is not in the "
        f"distance above; at 100 W/m2 the skin would be at risk {where}.",
    )
