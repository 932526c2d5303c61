"""Measured values as a page: readings and diameters in, an evaluation out."""

from __future__ import annotations

import re
from functools import cache
from typing import Any

import numpy as np
from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import cautions, rule_sets
from service.contract.measured import MeasuredRequest, MeasuredResult
from service.contract.measured_answer import measured
from service.contract.problem import FieldError, InvalidRequest
from service.files import DATA
from service.rules.tables import read_toml
from service.web.entries import Entry, Group, Sheet, read_items
from service.web.graph import Chart, chart
from service.web.links import address_of
from service.web.numbers import NotANumber, parse_number
from service.web.templates import page
from service.web.tolerance_pages import tolerance_address

__all__ = ["router"]

router = APIRouter(include_in_schema=False)

SAMPLES = 81
QUANTITIES = (
    ("power_w", "power [W]"),
    ("energy_j", "energy of one pulse [J]"),
    ("irradiance_w_m2", "irradiance [W/m²]"),
    ("radiant_exposure_j_m2", "radiant exposure of one pulse [J/m²]"),
)


@cache
def _groups() -> tuple[Group, ...]:
    """The form."""
    rules = tuple((c.rules.id, c.rules.title) for c in rule_sets().values())
    return (
        Group(
            "Laser and rule set",
            (
                Entry("label", "Name of this laser", help="Your own words."),
                Entry("rules", "Rule set", choices=rules),
                Entry("wavelength_nm", "Wavelength", "nm"),
                Entry("exposure_s", "Exposure duration", "s", "Blank: the usual one."),
                Entry("pulse_s", "Pulse duration", "s", "Blank: continuous."),
                Entry("rate_hz", "Repetition rate", "Hz", "Blank: a single pulse."),
            ),
        ),
        Group(
            "What the instrument read",
            (
                Entry("reading.quantity", "Quantity", choices=QUANTITIES),
                Entry("reading.value", "Reading", "as chosen"),
                Entry("reading.aperture_mm", "Aperture", "mm", "Diameter in front of the detector."),
                Entry("reading.distance_m", "At a distance of", "m", "Blank: at the exit."),
                Entry("reading.uncertainty_percent", "Uncertainty", "%", "Expanded, 95 %. Blank: none."),
            ),
        ),
        Group(
            "Beam diameters along the beam",
            (
                Entry(
                    "points",
                    "Distance [m] and diameter [mm], one place a line",
                    help="0.5 1.12, or with both axes 0.5 1.12 1.30; ± 0.02 behind it where each has its own "
                    "uncertainty. Second-moment (1/e²) diameters.",
                    rows=10,
                ),
                Entry("diameter_uncertainty_percent", "Uncertainty of all", "%", "Of the instrument, 95 %."),
            ),
        ),
        Group(
            "or the beam as the data sheet gives it",
            (
                Entry("beam.diameter_mm", "Beam diameter", "mm"),
                Entry("beam.divergence_mrad", "Divergence, full angle", "mrad"),
                Entry("beam.level", "At", choices=(("1/e2", "1/e² of the peak"), ("1/e", "1/e of the peak"))),
                Entry("beam.profile", "Profile", choices=(("gaussian", "Gaussian"), ("tophat", "top hat"))),
            ),
        ),
    )


def _points(text: str, errors: list[FieldError]) -> list[dict[str, Any]]:
    """Lines of the text as points; a line that cannot be read joins the errors."""
    found = []
    for number, line in enumerate((t.strip() for t in re.split(r"[\r\n;]+", text)), start=1):
        if not line:
            continue
        try:
            main, _, own = line.partition("±")
            values = [parse_number(word) for word in main.split()]
            if len(values) not in (2, 3):
                raise NotANumber(f"line {number} holds {len(values)} numbers", "Write distance and diameter.")
            point: dict[str, Any] = {"distance_m": values[0]}
            point["diameter_mm"] = values[1] if len(values) == 2 else values[1:]
            if own:
                point["uncertainty_mm"] = parse_number(own)
            found.append(point)
        except NotANumber as error:
            errors.append(
                FieldError(
                    field="points",
                    value=line[:100],
                    allowed="a distance in m and a diameter in mm on each line",
                    message=f"line {number}: {error}",
                    remedy=error.remedy,
                )
            )
    return found


def _request(sheet: Sheet, errors: list[FieldError]) -> MeasuredRequest:
    body = sheet.body(errors)
    beam = body.get("beam", {})
    if not beam.keys() & {"diameter_mm", "divergence_mrad"}:
        body.pop("beam", None)
    body.setdefault("reading", {})
    if "points" in body:
        body["points"] = _points(body["points"], errors)
    try:
        return sheet.validated(MeasuredRequest, body, errors)
    except InvalidRequest as problem:
        listed = [
            e.model_copy(update={"field": "points"}) if e.field.startswith("points.") else e
            for e in problem.errors
        ]
        raise InvalidRequest(problem.detail, listed) from None


def _chart(request: MeasuredRequest, result: MeasuredResult) -> Chart | None:
    """Measured diameters over distance and the fitted beam."""
    if not result.fits:
        return None
    places = [p.distance_m for p in request.points]
    z = np.linspace(min(places), max(places), SAMPLES)
    lines, marks = [], []
    size = 0.006 * (max(places) - min(places))
    for k, fit in enumerate(result.fits):
        away = fit.divergence_mrad.value * (z - fit.waist_m.value)
        d = np.hypot(fit.waist_diameter_mm.value, away)
        name = "fitted beam" if fit.axis == "both" else f"fitted beam, axis {fit.axis}"
        lines.append((name, z.tolist(), d.tolist()))
        for place, point in zip(places, request.points, strict=True):
            y = point.diameter_mm[k]
            marks.append(("", [place - size, place + size], [y, y]))
    if len(lines) == 1:
        lines.append(("", [], []))
    return chart("distance", "m", "diameter [mm]", "", [*lines, *marks])


@cache
def _examples() -> list[tuple[str, str]]:
    entries = read_toml(DATA / "demo" / "measured.toml")["example"]
    return [(e["name"], f"/measured?{Sheet(_groups(), dict(e['values'])).query()}") for e in entries]


@router.get("/measured")
def measured_page(request: Request) -> Response:
    """Readings and diameters, the fitted beam, and the evaluation that follows."""
    items = read_items(request)
    sheet = Sheet.read(_groups(), items) if items else Sheet(_groups())
    result: MeasuredResult | None = None
    drawn: Chart | None = None
    errors: list[FieldError] = []
    if items:
        try:
            wanted = _request(sheet, errors)
            result = measured(wanted)
            drawn = _chart(wanted, result)
        except InvalidRequest as problem:
            errors = problem.errors
    return page(
        request,
        "bounds/measured.html",
        status=422 if errors else 200,
        form=sheet,
        errors=errors,
        error_of={e.field: e for e in reversed(errors)},
        result=result,
        chart=drawn,
        examples=_examples(),
        address=address_of(result.evaluation) if result else "",
        tolerance=tolerance_address(result.tolerance) if result and result.tolerance else "",
        cautions=cautions(),
    )
