"""Before first light: bounds of a laser that nobody has measured, as a page."""

from __future__ import annotations

from functools import cache
from typing import Any

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import cautions, rule_sets
from service.contract.bounds import BoundsRequest
from service.contract.bounds_answer import bounds
from service.contract.bounds_medium import media_documents
from service.contract.bounds_result import BoundsResult
from service.contract.problem import FieldError, InvalidRequest
from service.files import DATA
from service.rules.gain_media import gain_media
from service.rules.tables import read_toml
from service.web.entries import Entry, Group, Sheet, read_items
from service.web.graph import Chart, chart
from service.web.links import address_of
from service.web.templates import page

__all__ = ["router"]

router = APIRouter(include_in_schema=False)

BLANK = "Blank: from the medium."


@cache
def _groups() -> tuple[Group, ...]:
    """The form."""
    media = (("", "none of these"), *((m.key, m.name) for m in media_documents()))
    rules = tuple((c.rules.id, c.rules.title) for c in rule_sets().values())
    levels = (("", "as the medium"), ("4", "four"), ("3", "three or quasi-three"), ("2", "two"))
    return (
        Group(
            "Laser and rule set",
            (
                Entry("label", "Name of this laser", help="Your own words."),
                Entry("rules", "Rule set", choices=rules),
            ),
        ),
        Group(
            "Pump",
            (
                Entry("pump.mode", "Pump", choices=(("cw", "continuous"), ("pulse", "pulses"))),
                Entry("pump.power_w", "Pump power", "W", "Continuous pumps: all that can reach the medium."),
                Entry("pump.energy_j", "Pump energy", "J", "Pulsed pumps: energy of one pulse."),
                Entry("pump.pulse_s", "Pump pulse", "s", "Its duration: 200 µs is 2e-4."),
                Entry("pump.rate_hz", "Pump repetition rate", "Hz", "Blank: a single pulse."),
                Entry("pump.absorbed_fraction", "Absorbed at most", "%", "Blank: all of it.", scale=0.01),
                Entry(
                    "pump.leak_fraction", "Leaves the housing at most", "%", "Blank: all of it.", scale=0.01
                ),
            ),
        ),
        Group(
            "Medium",
            (
                Entry("medium", "Gain medium", choices=media, help="Fills in the figures below."),
                Entry("levels", "Levels", choices=levels),
                Entry("wavelength_nm", "Laser wavelength", "nm", BLANK),
                Entry("pump_wavelength_nm", "Pump wavelength", "nm", BLANK),
                Entry("lifetime_s", "Upper-state lifetime", "s", BLANK),
                Entry("cross_section_cm2", "Emission cross-section", "cm²", BLANK),
                Entry("density_cm3", "Density of active ions", "per cm³", BLANK),
                Entry("lower_ratio", "Lower-level absorption", "× σ", "Over emission; 1 with three levels."),
                Entry("quantum_yield", "Quantum yield", "per photon", "Blank: from the medium, else 1."),
                Entry("resonator.medium_length_mm", "Length of the medium", "mm"),
                Entry(
                    "resonator.medium_diameter_mm",
                    "Diameter of the medium",
                    "mm",
                    "Blank: storage is limited by the pump alone.",
                ),
            ),
        ),
        Group(
            "Resonator",
            (
                Entry("resonator.length_mm", "Optical length", "mm", "Mirror to mirror, one way."),
                Entry("resonator.output_reflectance", "Output mirror reflects", "%", scale=0.01),
                Entry("resonator.rear_reflectance", "Rear mirror reflects", "%", "Blank: 100.", scale=0.01),
                Entry("resonator.loss", "Other loss per round trip", "%", "Blank: none.", scale=0.01),
                Entry("resonator.mode_diameter_mm", "Mode diameter", "mm", "1/e², in the medium."),
                Entry("q_switch.rate_hz", "Q-switched rate", "Hz", "Continuous pumps; blank: not repeated."),
                Entry("q_switch.open_s", "Switch stays open", "s", "Blank: 1e-6."),
            ),
        ),
        Group(
            "Beam outside",
            (
                Entry("beam.diameter_mm", "Beam diameter", "mm", "1/e²; blank: that of the mode."),
                Entry("beam.divergence_mrad", "Divergence, full angle", "mrad", "Blank: diffraction limit."),
                Entry(
                    "beam.pump_divergence_mrad",
                    "Divergence of leaking pump",
                    "mrad",
                    "Blank: diffraction limit.",
                ),
            ),
        ),
    )


def _curves(result: BoundsResult) -> dict[str, tuple[Chart, str, str]]:
    """Charts with their titles and descriptions."""
    found = {}
    parts = [("on", "Pump switched on", result.switch_on), ("q", "Resonator opened", result.q_switch)]
    for key, name, curve in parts:
        if curve is None:
            continue
        top = max(curve.output_w)
        found[f"{key}-inversion"] = (
            chart(
                "time", "s", "inversion over threshold", "", [("inversion", curve.time_s, curve.inversion)]
            ),
            f"{name}: inversion over its value at threshold",
            f"From {curve.inversion[0]:.3g} at first to {curve.inversion[-1]:.3g} at the end.",
        )
        found[f"{key}-upper"] = (
            chart("time", "s", "ions in the upper level", "", [("ions", curve.time_s, curve.upper_ions)]),
            f"{name}: ions in the upper level",
            f"From {curve.upper_ions[0]:.3g} to {curve.upper_ions[-1]:.3g}.",
        )
        found[f"{key}-light"] = (
            chart("time", "s", "power outside", "W", [("power", curve.time_s, curve.output_w)]),
            f"{name}: power through the output mirror",
            f"Highest {top:.3g} W, at the end {curve.output_w[-1]:.3g} W.",
        )
    return found


@cache
def _examples() -> list[tuple[str, str]]:
    entries = read_toml(DATA / "demo" / "unmeasured.toml")["example"]
    return [
        (e["name"], f"/before-first-light?{Sheet(_groups(), dict(e['values'])).query()}") for e in entries
    ]


@router.get("/before-first-light")
def before_first_light(request: Request) -> Response:
    """Bounds of an unmeasured laser."""
    items = read_items(request)
    sheet = Sheet.read(_groups(), items) if items else Sheet(_groups())
    result: BoundsResult | None = None
    errors: list[FieldError] = []
    if items:
        try:
            result = bounds(_request(sheet, errors))
        except InvalidRequest as problem:
            errors = problem.errors
    return page(
        request,
        "bounds/before_first_light.html",
        status=422 if errors else 200,
        form=sheet,
        errors=errors,
        error_of={e.field: e for e in reversed(errors)},
        result=result,
        charts=_curves(result) if result else {},
        examples=_examples(),
        address_of=address_of,
        cautions=cautions(),
    )


def _request(sheet: Sheet, errors: list[FieldError]) -> BoundsRequest:
    body: dict[str, Any] = sheet.body(errors)
    if "levels" in body:
        body["levels"] = int(body["levels"]) if body["levels"] in ("2", "3", "4") else body["levels"]
    for part in ("pump", "resonator"):
        body.setdefault(part, {})
    return sheet.validated(BoundsRequest, body, errors)


@router.get("/gain-media")
async def gain_media_page(request: Request) -> Response:
    """The table of gain media."""
    media = gain_media(DATA)
    named = {row.source for m in media.media.values() for row in m.rows.values()}
    documents = [source for key, source in media.sources.items() if key in named]
    return page(request, "bounds/gain_media.html", media=media_documents(), documents=documents)
