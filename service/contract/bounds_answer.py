"""Requests for bounds to answers."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from service import __version__
from service.contract.answer import answer, cautions, rule_set
from service.contract.bounds import BoundsRequest
from service.contract.bounds_curves import opened, stored_ions, switched_on
from service.contract.bounds_figures import bound_figures, computed_figures
from service.contract.bounds_medium import is_discharge, medium_of
from service.contract.bounds_result import BoundsResult, Outcome, Scenario
from service.contract.request import MAX_LABEL, EvaluationRequest
from service.contract.result import Notice
from service.files import DATA
from service.optics.gain_bounds import (
    GainBounds,
    Media,
    Pumps,
    diffraction_limit_rad,
    gain_bounds,
)
from service.optics.rate_equations import LIGHT_M_S, PLANCK_J_S, Resonators
from service.rules.gain_media import gain_media

__all__ = ["bounds", "outcome_of"]

#: Shortest pulse and least power that an evaluation takes [s, W].
SHORTEST_S, FAINTEST = 1e-13, 1e-15
WIDEST_MRAD = 3141.0
MARK = "bound, not measured"


def bounds(request: BoundsRequest) -> BoundsResult:
    """Bounds of one unmeasured laser. Raises InvalidRequest where the medium cannot lase or is unknown."""
    rule_set(request.rules)
    figures = medium_of(request)
    value = {quantity: figure.value for quantity, figure in figures.items()}
    laser, pump, medium = _arrays(request, value)
    found = gain_bounds(laser, pump, medium)
    pulse = opened(laser, pump)
    label = f"{request.label} ({MARK})" if request.label else MARK.capitalize()
    return BoundsResult(
        label=label[-MAX_LABEL:],
        inputs=request.model_dump(mode="json", exclude_none=True),
        medium=list(figures.values()),
        bounds=bound_figures(request, laser, pump, found),
        computed=computed_figures(laser, pump, stored_ions(laser, pump), pulse[1] if pulse else None),
        scenarios=_scenarios(request, value, found, label[-MAX_LABEL:]),
        switch_on=switched_on(laser, pump),
        q_switch=pulse[0] if pulse else None,
        notices=_notices(request, value, found, pulse is not None),
        cautions=cautions(),
        service_version=__version__,
        media_digest=gain_media(DATA).digest,
    )


def outcome_of(evaluation: EvaluationRequest) -> Outcome:
    """An evaluation in short."""
    result = answer(evaluation)
    return Outcome(
        eye_hazard_distance_m=result.eye.hazard_distance_m,
        eye_hazard_ratio=result.eye.hazard_ratio,
        eye_optical_density=result.eye.optical_density,
        skin_hazard_distance_m=result.skin.hazard_distance_m,
        hazard_class=result.classification[0].hazard_class,
    )


def _arrays(request: BoundsRequest, value: dict[str, Any]) -> tuple[Resonators, Pumps, Media]:
    """The laser as arrays in SI; millimetres, nanometres and cm2 are converted here."""
    cavity, pump = request.resonator, request.pump
    density = math.inf if value.get("density_cm3") is None else value["density_cm3"] * 1e6
    mode_area = math.pi / 4.0 * (cavity.mode_diameter_mm * 1e-3) ** 2
    length = cavity.medium_length_mm * 1e-3
    across = cavity.medium_diameter_mm
    whole = math.inf if across is None else density * math.pi / 4.0 * (across * 1e-3) ** 2 * length
    power = pump.power_w if pump.power_w is not None else (pump.energy_j or 0.0) / (pump.pulse_s or 1.0)
    photon = PLANCK_J_S * LIGHT_M_S / (value["pump_wavelength_nm"] * 1e-9)
    rate = pump.rate_hz or 0.0
    switch = request.q_switch
    hold = 1.0 / switch.rate_hz if switch is not None and switch.rate_hz is not None else math.inf

    def one(x: float) -> Any:
        return np.array([x])

    laser = Resonators(
        wavelength_m=one(value["wavelength_nm"] * 1e-9),
        cross_section_m2=one(value["cross_section_cm2"] * 1e-4),
        lifetime_s=one(value["lifetime_s"]),
        ions=one(density * mode_area * length),
        lower_ratio=one(value["lower_ratio"]),
        mode_area_m2=one(mode_area),
        length_m=one(cavity.length_mm * 1e-3),
        output_reflectance=one(cavity.output_reflectance),
        rear_reflectance=one(cavity.rear_reflectance),
        loss=one(cavity.loss),
    )
    pumps = Pumps(
        photons_per_s=one(power * pump.absorbed_fraction * value["quantum_yield"] / photon),
        pulse_s=one(math.inf if pump.pulse_s is None else pump.pulse_s),
        period_s=one(1.0 / rate if rate else math.inf),
        hold_s=one(hold),
        open_s=one(1e-6 if switch is None else switch.open_s),
    )
    # The narrower medium gains more in one pass: without a diameter of its own the mode's is taken.
    narrow = cavity.mode_diameter_mm if across is None else min(across, cavity.mode_diameter_mm)
    return laser, pumps, Media(one(whole), one(length), one(narrow * 1e-3))


def _scenarios(
    request: BoundsRequest, value: dict[str, Any], found: GainBounds, label: str
) -> list[Scenario]:
    """The ways in which the laser may run, each with the lines that may leave it."""
    pump, switch = request.pump, request.q_switch
    shortest = max(float(found.shortest_s[0]), SHORTEST_S)
    power, first, regular = (float(x[0]) for x in (found.power_w, found.pulse_j, found.regular_pulse_j))
    background = _background(request, value, found)
    single: dict[str, Any] = {"mode": "pulse", "energy_j": first, "pulse_s": shortest}
    rate: float | None
    if pump.mode == "cw":
        rate = switch.rate_hz if switch is not None else None
        running: dict[str, Any] = {"mode": "cw", "power_w": power}
        how = "Every pump photon becomes a laser photon, continuously."
    else:
        assert pump.pulse_s is not None
        rate = pump.rate_hz
        running = _repeated(power * pump.pulse_s, pump.pulse_s, rate)
        how = "Every pump photon becomes a laser photon while the pump pulse lasts."
    ways = [
        ("running", "Running freely", how, running),
        (
            "first_pulse",
            "First pulse",
            "All that the medium can store leaves in one pulse as short as the resonator allows: the first "
            "opening of a Q-switch after a pause, or a mirror that is turned into place under a running "
            "pump.",
            single,
        ),
    ]
    if rate is not None and (switch is not None or pump.mode == "pulse"):
        text = (
            "Q-switched pulses at the given rate, which share the pump; one after a pause can be as large "
            "as the first."
        )
        ways.append(("pulse_train", "Q-switched train", text, _repeated(regular, shortest, rate)))
    scenarios = []
    for key, title, text, emission in ways:
        line = {"wavelength_nm": value["wavelength_nm"], "emission": emission, "beam": _beam(request, value)}
        evaluation = EvaluationRequest.model_validate(
            {"label": label, "rules": request.rules, "basis": "bound", "lines": [line, *background]}
        )
        scenarios.append(
            Scenario.model_validate(
                {
                    "id": key,
                    "title": title,
                    "text": text,
                    "evaluation": evaluation.model_dump(mode="json", exclude_unset=True),
                    "outcome": outcome_of(evaluation),
                }
            )
        )
    return scenarios


def _repeated(energy_j: float, pulse_s: float, rate_hz: float | None) -> dict[str, Any]:
    """A pulse, or a train where there is a rate."""
    pulse = {"energy_j": energy_j, "pulse_s": pulse_s}
    return {"mode": "pulse", **pulse} if rate_hz is None else {"mode": "train", **pulse, "rate_hz": rate_hz}


def _beam(request: BoundsRequest, value: dict[str, Any]) -> dict[str, Any]:
    """The beam outside: as given, else as wide as the mode and as parallel as diffraction allows."""
    diameter = request.beam.diameter_mm or request.resonator.mode_diameter_mm
    divergence = request.beam.divergence_mrad or _limit_mrad(value["wavelength_nm"], diameter)
    return {"diameter_mm": diameter, "divergence_mrad": divergence}


def _limit_mrad(wavelength_nm: float, diameter_mm: float) -> float:
    """Diffraction limit [mrad], within what an evaluation takes."""
    limit = diffraction_limit_rad(np.array([wavelength_nm * 1e-9]), np.array([diameter_mm * 1e-3]))
    return min(float(limit[0]) * 1e3, WIDEST_MRAD)


def _background(request: BoundsRequest, value: dict[str, Any], found: GainBounds) -> list[dict[str, Any]]:
    """Amplified spontaneous emission and residual pump as lines of their own."""
    pump, beam = request.pump, _beam(request, value)
    lines = []
    share = float(found.spontaneous_share[0])
    cone = min(float(found.spontaneous_rad[0]) * 1e3, WIDEST_MRAD)
    own: dict[str, Any] = {
        "profile": "tophat",
        "diameter_mm": request.resonator.mode_diameter_mm,
        "divergence_mrad": cone,
    }
    if share >= 1.0:
        # What is saturated need not fill the cone: as narrow as the laser beam is the stricter.
        own = beam
    lines.append((value["wavelength_nm"], float(found.power_w[0]) * share, own))
    whole = pump.power_w if pump.power_w is not None else (pump.energy_j or 0.0) / (pump.pulse_s or 1.0)
    leaving = whole * pump.leak_fraction
    if not is_discharge(request, value["pump_wavelength_nm"]):
        across = beam["diameter_mm"]
        spread = request.beam.pump_divergence_mrad or _limit_mrad(value["pump_wavelength_nm"], across)
        leak = {"diameter_mm": across, "divergence_mrad": spread}
        lines.append((value["pump_wavelength_nm"], leaving, leak))
    return [
        {
            "wavelength_nm": wavelength,
            "emission": {"mode": "cw", "power_w": watts}
            if pump.pulse_s is None
            else _repeated(watts * pump.pulse_s, pump.pulse_s, pump.rate_hz),
            "beam": shape,
        }
        for wavelength, watts, shape in lines
        if watts >= FAINTEST and (pump.pulse_s is None or watts * pump.pulse_s >= 1e-21)
    ]


def _notices(request: BoundsRequest, value: dict[str, Any], found: GainBounds, lases: bool) -> list[Notice]:
    notices = [
        Notice(
            code="bound-not-measured",
            field=None,
            text="Bounds tell what the laser cannot exceed. They are far above what most lasers reach, and "
            "they are no measurement: measure before anything is relaxed because of them.",
        )
    ]
    if request.medium is not None:
        notices.append(
            Notice(
                code="from-memory",
                field="medium",
                text="Figures of the medium are from memory; where they are uncertain the one with the "
                "higher output is taken. The bounds of power rest on the two wavelengths and the quantum "
                "yield alone.",
            )
        )
    if not lases:
        notices.append(
            Notice(
                code="below-threshold",
                field="pump",
                text="With these figures the rate equations stay below threshold: no laser light is "
                "expected. The bounds hold all the same, and with less loss the laser may start.",
            )
        )
    if request.beam.divergence_mrad is None:
        notices.append(
            Notice(
                code="diffraction-limited-beam",
                field="beam.divergence_mrad",
                text="No divergence was given: the beam is taken as parallel as diffraction allows for its "
                "diameter, which carries the hazard farthest. Optics that widen the beam can carry it "
                "farther.",
            )
        )
    if is_discharge(request, value["pump_wavelength_nm"]):
        notices.append(
            Notice(
                code="pump-is-no-light",
                field="pump_wavelength_nm",
                text="The pump is a discharge, not a beam: it makes no line. Its own ultraviolet and visible "
                "glow is not judged.",
            )
        )
    if found.shortest_s[0] < found.round_trip_s[0]:
        notices.append(
            Notice(
                code="shorter-than-round-trip",
                field="resonator",
                text="A photon lives for less than a round trip in this resonator, where the rate equations "
                "are a rough guide. The bounds of energy hold; modes that lock make spikes shorter than the "
                "shortest pulse told here.",
            )
        )
    return notices
