"""Tolerances of an evaluation as a page: the form of the evaluation travels along in the address."""

from __future__ import annotations

import re
from functools import cache
from typing import Any
from urllib.parse import quote, urlencode

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import cautions
from service.contract.beam import Beam, FibreMultimode, FibreSingleMode
from service.contract.problem import UNITS, FieldError, InvalidRequest
from service.contract.request import EvaluationRequest, Train
from service.contract.tolerance import ToleranceRequest, ToleranceResult
from service.contract.tolerance_answer import tolerance
from service.files import DATA
from service.rules.tables import read_toml
from service.web.entries import Entry, Group, Sheet, in_words, read_items
from service.web.fields import BEAM, FIELDS
from service.web.form import Form
from service.web.graph import Chart, bars
from service.web.links import address_of
from service.web.numbers import NotANumber, parse_number, plain
from service.web.templates import page
from service.web.understood import SHOWN_UNITS

__all__ = ["router", "tolerance_address"]

router = APIRouter(include_in_schema=False)

AMOUNT, MEANING = "t.", "m."
RANGE = re.compile(r"(?P<low>.+?)\s*(?:to|\.\.|…)\s*(?P<high>.+)")
MEANINGS = (("uniform", "never outside"), ("normal", "95 % within"))
TITLES = {
    "eye_hazard_distance_m": ("Eye hazard distance", "m"),
    "eye_hazard_ratio": ("Eye: exposure over limit", ""),
    "eye_optical_density": ("Eye: optical density", ""),
    "skin_hazard_distance_m": ("Skin hazard distance", "m"),
    "skin_hazard_ratio": ("Skin: exposure over limit", ""),
    "skin_optical_density": ("Skin: optical density", ""),
}


def figures_of(evaluation: EvaluationRequest) -> list[tuple[str, str, float]]:
    """Path, label and value of every figure that may carry a tolerance."""
    found = []
    several = len(evaluation.lines) > 1
    for k, line in enumerate(evaluation.lines):
        emission = line.emission
        names = ("power_w", "energy_j", "average_power_w", "pulse_s", "rate_hz")
        given = [(f"emission.{n}", n, getattr(emission, n, None)) for n in names]
        if isinstance(emission, Train) and emission.average_power_w is not None:
            given = [g for g in given if g[1] != "energy_j"]
        given += [
            *_figures_of_beam(line.beam),
            ("wavelength_nm", "wavelength_nm", line.wavelength_nm),
            ("subtense_mrad", "subtense_mrad", line.subtense_mrad if line.subtense_mrad > 1.5 else None),
        ]
        where = f", line {k + 1}" if several else ""
        found += [(f"lines.{k}.{path}", FIELDS[n].label + where, v) for path, n, v in given if v is not None]
    if evaluation.exposure_s is not None:
        found.append(("exposure_s", FIELDS["exposure_s"].label, evaluation.exposure_s))
    return found


def _figures_of_beam(beam: Beam | FibreSingleMode | FibreMultimode) -> list[tuple[str, str, float | None]]:
    """Path, name on the form and value of the figures of a beam."""
    if not isinstance(beam, Beam):
        return [(f"beam.{name}", name, getattr(beam, name)) for name in BEAM[beam.profile]]
    found: list[tuple[str, str, float | None]] = []
    for stem in ("diameter_mm", "divergence_mrad"):
        x, y = getattr(beam, stem)
        if x == y:
            found.append((f"beam.{stem}", stem, x))
        else:
            other = stem.replace("_m", "_y_m")
            found += [(f"beam.{stem}.0", stem, x), (f"beam.{stem}.1", other, y)]
    return [*found, ("beam.waist_m", "waist_m", beam.waist_m or None)]


def _unit(path: str) -> str:
    name = next(p for p in reversed(path.split(".")) if not p.isdecimal())
    unit = UNITS.get(name.rpartition("_")[2], "")
    return SHOWN_UNITS.get(unit, unit)


def _groups(evaluation: EvaluationRequest | None) -> tuple[Group, ...]:
    """Two fields for every figure: how far, and what it means; draws and seed."""
    entries = []
    for path, label, value in figures_of(evaluation) if evaluation else ():
        unit = _unit(path)
        help_ = f"Given: {plain(value)} {unit}".rstrip() + "."
        entries.append(
            Entry(AMOUNT + path, label, f"% or {unit}" if unit else "% or amount", help_, number=False)
        )
        entries.append(Entry(MEANING + path, f"{label}: how sure", choices=MEANINGS))
    return (
        Group(
            "Tolerances",
            tuple(entries),
            "5 % is five per cent; 0.2 an amount in the unit; 0.9 to 1.2 a range.",
        ),
        Group(
            "Draws",
            (
                Entry("draws", "Number of draws", "#", "Blank: 100,000, fewer if slow."),
                Entry("seed", "Seed", "#", "Same seed, same draws."),
            ),
        ),
    )


def _tolerance(path: str, text: str, meaning: str) -> dict[str, Any]:
    """One typed tolerance. Raises NotANumber."""
    found: dict[str, Any] = {"field": path, "meaning": meaning}
    span = RANGE.fullmatch(text)
    if span:
        return found | {"low": parse_number(span["low"]), "high": parse_number(span["high"])}
    text = text.lstrip("±").strip()
    if text.endswith("%"):
        return found | {"plus_minus_percent": parse_number(text[:-1])}
    return found | {"plus_minus": parse_number(text)}


def _request(evaluation: EvaluationRequest, sheet: Sheet, errors: list[FieldError]) -> ToleranceRequest:
    """The request. Raises InvalidRequest under the names of the form's fields."""
    paths, given = [], []
    for path, _, _ in figures_of(evaluation):
        text = sheet.get(AMOUNT + path)
        if not text:
            continue
        try:
            given.append(_tolerance(path, text, sheet.get(MEANING + path, "uniform")))
            paths.append(path)
        except NotANumber as error:
            errors.append(
                FieldError(
                    field=AMOUNT + path,
                    value=text[:100],
                    allowed="5 %, 0.2, or 0.9 to 1.2",
                    message=str(error),
                    remedy=error.remedy,
                )
            )
    body: dict[str, Any] = {"tolerances": given}
    for name in ("draws", "seed"):
        text = sheet.get(name)
        if not text:
            continue
        body[name] = int(text) if text.isascii() and text.isdecimal() and len(text) < 17 else text
    body["evaluation"] = evaluation.model_dump(mode="json", exclude_unset=True)
    try:
        if not given and not errors:
            blank = FieldError(
                field="tolerances",
                value=None,
                allowed="at least one",
                message="no figure has a tolerance yet",
                remedy="Fill in one of the fields.",
            )
            raise InvalidRequest("no tolerance", [blank])
        return sheet.validated(ToleranceRequest, body, errors)
    except InvalidRequest as problem:
        raise InvalidRequest(problem.detail, _typed(problem.errors, paths)) from None


def _typed(errors: list[FieldError], paths: list[str]) -> list[FieldError]:
    """Errors of tolerances under the names of the form's fields."""
    found = []
    for error in errors:
        match = re.match(r"tolerances\.(\d+)", error.field)
        field = AMOUNT + paths[int(match[1])] if match else error.field
        found.append(error.model_copy(update={"field": field}))
    return found


def _charts(result: ToleranceResult) -> dict[str, tuple[Chart, str, str]]:
    charts = {}
    for d in result.distributions:
        name, unit = TITLES[d.figure]
        if d.histogram is not None:
            low, high = d.interval_95
            ends = f"95 % of the draws lie between {low:.4g} and {high:.4g} {unit}." if low and high else ""
            charts[d.figure] = bars(name.lower(), unit, d.histogram.edges, d.histogram.counts), name, ends
    return charts


@cache
def _examples() -> list[tuple[str, str]]:
    entries = read_toml(DATA / "demo" / "examples.toml")["example"]
    return [(e["name"], f"/tolerance?{Form(dict(e['values'])).query()}") for e in entries]


@router.get("/tolerance")
def tolerance_page(request: Request) -> Response:
    """The figures of an evaluation, their tolerances, and what comes of them."""
    items = read_items(request)
    own = [(n, v) for n, v in items if n.startswith((AMOUNT, MEANING)) or n in ("draws", "seed")]
    rest = [(n, v) for n, v in items if (n, v) not in own]
    form = Form.read(rest) if items else None
    evaluation, result = None, None
    errors: list[FieldError] = []
    sheet = Sheet(_groups(None))
    if form is not None:
        try:
            evaluation = form.request()
            sheet = Sheet.read(_groups(evaluation), [("v", "1"), *own])
            if any(name.startswith(AMOUNT) and value.strip() for name, value in own):
                result = tolerance(_request(evaluation, sheet, errors))
        except InvalidRequest as problem:
            errors = in_words(problem.errors)
    return page(
        request,
        "bounds/tolerance.html",
        status=422 if errors else 200,
        laser=form,
        form=sheet,
        evaluation=evaluation,
        evaluation_address=f"/evaluate?{form.query()}" if form else "/",
        hidden=[(n, v) for n, v in rest if v.strip()],
        labels={path: label for path, label, _ in (figures_of(evaluation) if evaluation else ())},
        unit_of=_unit,
        titles=TITLES,
        result=result,
        charts=_charts(result) if result else {},
        errors=errors,
        error_of={e.field: e for e in reversed(errors)},
        examples=_examples(),
        worst_address=address_of(result.worst_case.evaluation) if result else "",
        cautions=cautions(),
    )


def tolerance_address(request: dict[str, Any]) -> str:
    """Address of this page for a request (a body as JSON), each tolerance in per cent or an amount."""
    items = []
    for t in request["tolerances"]:
        share, amount = t.get("plus_minus_percent"), t.get("plus_minus")
        items.append((AMOUNT + t["field"], f"{plain(amount)}" if share is None else f"{plain(share)} %"))
        items.append((MEANING + t["field"], t["meaning"]))
    return address_of(request["evaluation"], "/tolerance", f"&{urlencode(items, quote_via=quote)}")
