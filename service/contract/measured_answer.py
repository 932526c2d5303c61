"""Measured values to evaluations."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, Literal, cast

import numpy as np
from pydantic import ValidationError

from service import __version__
from service.contract.answer import cautions, rule_set
from service.contract.bounds_answer import outcome_of
from service.contract.bounds_medium import refuse
from service.contract.convert import lines_of
from service.contract.measured import AxisFit, MeasuredRequest, MeasuredResult, Value
from service.contract.problem import invalid_request
from service.contract.request import EvaluationRequest
from service.contract.result import Notice
from service.contract.tolerance import ToleranceRequest
from service.optics.beam_fit import BeamFit, NoBeam, fit_beam

__all__ = ["measured"]

#: ISO 11146 asks for this many places (from memory).
ENOUGH = 10
#: Below this share in the aperture the whole beam is told with little certainty.
SMALL_SHARE = 0.1


def measured(request: MeasuredRequest) -> MeasuredResult:
    """One measured line. Raises InvalidRequest where the points fit no beam."""
    rules = rule_set(request.rules)
    fits = _fits(request)
    beam = _beam(request, fits)
    # The engine's own fraction: the reading is asked of a beam that emits one watt or joule.
    unit = _evaluation(request, beam, 1.0)
    lines, _ = lines_of([unit], rules)
    reading = request.reading
    aperture, place = np.array([reading.aperture_mm * 1e-3]), np.array([reading.distance_m])
    fraction = float(lines.beams.fraction(aperture, place)[0])
    through = reading.value
    if reading.quantity in ("irradiance_w_m2", "radiant_exposure_j_m2"):
        through *= math.pi / 4.0 * float(aperture[0]) ** 2
    total = through / fraction
    evaluation = _evaluation(request, beam, total)
    tolerances = _tolerances(request, fits, evaluation)
    body = evaluation.model_dump(mode="json", exclude_unset=True)
    wanted = {"evaluation": body, "tolerances": tolerances}
    return MeasuredResult(
        fits=[_axis(name, fit) for name, fit in fits],
        fraction=fraction,
        through=through,
        total=Value(value=total, uncertainty=total * reading.uncertainty_percent / 100.0),
        unit="W" if reading.quantity in ("power_w", "irradiance_w_m2") else "J",
        evaluation=body,
        outcome=outcome_of(evaluation),
        tolerance=ToleranceRequest.model_validate(wanted).model_dump(mode="json", exclude_unset=True)
        if tolerances
        else None,
        inputs=request.model_dump(mode="json", exclude_none=True),
        notices=_notices(request, fits, fraction),
        cautions=cautions(),
        service_version=__version__,
    )


def _fits(request: MeasuredRequest) -> list[tuple[str, BeamFit]]:
    """Fits of both axes, or of one where every diameter was given for both."""
    points = request.points
    if not points:
        return []
    round_ = all(p.diameter_mm[0] == p.diameter_mm[1] for p in points)
    own = [p.uncertainty_mm for p in points if p.uncertainty_mm is not None]
    found = []
    for k, axis in enumerate(("both",) if round_ else ("x", "y")):
        try:
            fit = fit_beam(
                np.array([p.distance_m for p in points]),
                np.array([p.diameter_mm[k] for p in points]) * 1e-3,
                np.array(own) * 1e-3 if own else None,
                request.diameter_uncertainty_percent / 100.0,
                request.wavelength_nm * 1e-9,
            )
        except NoBeam as error:
            raise refuse(
                "points",
                None,
                "diameters that fit a beam",
                str(error),
                "Measure at ten places or more, half of them within one Rayleigh length of the waist, half "
                "of them beyond two.",
            ) from None
        found.append((axis, fit))
    return found


def _axis(name: str, fit: BeamFit) -> AxisFit:
    return AxisFit(
        axis=cast(Literal["both", "x", "y"], name),
        waist_diameter_mm=Value(
            value=fit.waist_diameter_m * 1e3, uncertainty=fit.uncertainty_waist_diameter_m * 1e3
        ),
        waist_m=Value(value=fit.waist_m, uncertainty=fit.uncertainty_waist_m),
        divergence_mrad=Value(
            value=fit.divergence_rad * 1e3, uncertainty=fit.uncertainty_divergence_rad * 1e3
        ),
        m2=Value(value=fit.m2, uncertainty=fit.uncertainty_m2),
        rayleigh_m=fit.rayleigh_m,
        residuals_mm=(fit.residuals_m * 1e3).tolist(),
    )


def _beam(request: MeasuredRequest, fits: Sequence[tuple[str, BeamFit]]) -> dict[str, Any]:
    """The beam of the evaluation: as fitted, else as given.

    An evaluation has one waist for both axes: the farther one, which makes the beam beyond it no wider
    than it was measured.
    """
    if request.beam is not None:
        given: dict[str, Any] = request.beam.model_dump(mode="json", exclude_unset=True)
        return given
    diameters = [fit.waist_diameter_m * 1e3 for _, fit in fits]
    divergences = [fit.divergence_rad * 1e3 for _, fit in fits]
    return {
        "diameter_mm": diameters[0] if len(fits) == 1 else diameters,
        "divergence_mrad": divergences[0] if len(fits) == 1 else divergences,
        "waist_m": max(fit.waist_m for _, fit in fits),
    }


def _evaluation(request: MeasuredRequest, beam: dict[str, Any], total: float) -> EvaluationRequest:
    """The evaluation of the whole beam. Raises InvalidRequest where its figures leave their range."""
    emission: dict[str, Any]
    if request.pulse_s is None:
        emission = {"mode": "cw", "power_w": total}
    elif request.rate_hz is None:
        emission = {"mode": "pulse", "energy_j": total, "pulse_s": request.pulse_s}
    else:
        power = request.reading.quantity in ("power_w", "irradiance_w_m2")
        given = {"average_power_w": total} if power else {"energy_j": total}
        emission = {"mode": "train", **given, "pulse_s": request.pulse_s, "rate_hz": request.rate_hz}
    body: dict[str, Any] = {
        "label": request.label,
        "rules": request.rules,
        "basis": "measured",
        "lines": [{"wavelength_nm": request.wavelength_nm, "emission": emission, "beam": beam}],
    }
    if request.exposure_s is not None:
        body["exposure_s"] = request.exposure_s
    try:
        return EvaluationRequest.model_validate(body)
    except ValidationError as error:
        first = invalid_request(error).errors[0]
        raise refuse(
            "points" if ".beam" in first.field else "reading",
            first.value,
            first.allowed,
            f"the measured values come to a {first.field} that cannot be used: {first.message}",
            "Check the units of what was measured.",
        ) from None


def _tolerances(
    request: MeasuredRequest, fits: Sequence[tuple[str, BeamFit]], evaluation: EvaluationRequest
) -> list[dict[str, Any]]:
    """Uncertainties as tolerances with a normal meaning, in per cent."""
    found: list[tuple[str, dict[str, float]]] = []
    share = request.reading.uncertainty_percent
    if share > 0.0:
        emission = evaluation.lines[0].emission.model_dump(exclude_unset=True)
        given = next(n for n in ("power_w", "average_power_w", "energy_j") if n in emission)
        found.append((f"emission.{given}", {"plus_minus_percent": share}))
    for k, (_, fit) in enumerate(fits):
        axis = "" if len(fits) == 1 else f".{k}"
        for name, value, own in (
            ("diameter_mm", fit.waist_diameter_m, fit.uncertainty_waist_diameter_m),
            ("divergence_mrad", fit.divergence_rad, fit.uncertainty_divergence_rad),
        ):
            if own > 0.0:
                # Three standard deviations must leave something of the figure.
                found.append((f"beam.{name}{axis}", {"plus_minus_percent": min(60.0, 100.0 * own / value)}))
    if fits:
        own = max(fit.uncertainty_waist_m for _, fit in fits)
        if own > 0.0:
            found.append(("beam.waist_m", {"plus_minus": own}))
    return [{"field": f"lines.0.{field}", **size, "meaning": "normal"} for field, size in found]


def _notices(request: MeasuredRequest, fits: Sequence[tuple[str, BeamFit]], fraction: float) -> list[Notice]:
    notices = []

    def tell(code: str, field: str, text: str) -> None:
        notices.append(Notice(code=code, field=field, text=text))

    if fits and len(request.points) < ENOUGH:
        tell(
            "few-points",
            "points",
            f"{len(request.points)} places were measured; ISO 11146 asks for {ENOUGH} or more, half of them "
            "within one Rayleigh length of the waist and half beyond two (from memory).",
        )
    for axis, fit in fits:
        away = np.abs(np.array([p.distance_m for p in request.points]) - fit.waist_m) / fit.rayleigh_m
        which = "" if axis == "both" else f" of axis {axis}"
        if not (away < 1.0).any() or not (away > 2.0).any():
            tell(
                "places-one-sided",
                "points",
                f"The places do not reach both within one and beyond two Rayleigh lengths "
                f"({fit.rayleigh_m:.3g} m) of the waist{which}: waist and divergence hang on each other.",
            )
        if fit.m2 + fit.uncertainty_m2 < 1.0:
            tell(
                "below-diffraction-limit",
                "points",
                f"M2 comes to {fit.m2:.3g}{which}, below 1, which no beam has: check units and wavelength.",
            )
        if fit.uncertainty_divergence_rad > 0.6 * fit.divergence_rad:
            tell(
                "uncertain-divergence",
                "points",
                f"The divergence{which} is hardly known: measure farther out.",
            )
    if len(fits) == 2 and fits[0][1].waist_m != fits[1][1].waist_m:
        tell(
            "two-waists",
            "points",
            "The waists of both axes lie apart. The evaluation has one place for both, the farther one: the "
            "beam beyond it is then no wider than it was measured.",
        )
    if fraction < SMALL_SHARE:
        tell(
            "small-share",
            "reading.aperture_mm",
            f"Only {100.0 * fraction:.2g} % of the beam passes the aperture: the whole beam rests on the "
            "beam's shape more than on the reading. Measure nearer or with a wider aperture.",
        )
    return notices
