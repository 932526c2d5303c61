"""Profile files to answers."""

from __future__ import annotations

import hashlib

import numpy as np
from numpy.typing import NDArray

from service import __version__
from service.assess.criteria import RULES
from service.assess.evaluate import Evaluation, TargetResult, evaluate, optical_density
from service.contract.answer import cautions, rule_set
from service.contract.beam_only import evaluation_notices, refuse_aid, refuse_end
from service.contract.bounds_medium import refuse
from service.contract.convert import behind_bench, lines_of
from service.contract.picture import BadPicture, pixels_of
from service.contract.profile import (
    ApertureFraction,
    PlaneCriterion,
    PlaneTarget,
    ProfileRequest,
    ProfileResult,
)
from service.contract.result import Notice
from service.optics.beams import SQRT2
from service.optics.encircled import encircled_fraction
from service.optics.profile import FlatImage, Moments, background_of, moments, worst_fraction

__all__ = ["Picture", "picture", "profile"]

Floats = NDArray[np.float64]

#: Pixels at the very top of the scale that are taken for a saturated beam.
SATURATED = 12
EDGE = 0.01
FEW_PIXELS = 10.0
#: More of the beam than a Gaussian of its diameters by this factor is told; less is noise.
TOLD = 1.005


class Picture:
    """The signal of an image without background, its moments, and fractions found once per aperture."""

    def __init__(self, request: ProfileRequest) -> None:
        try:
            self.raw = pixels_of(request.image, request.format)
        except BadPicture as error:
            remedy = "Save the camera's greyscale image as PNG or TIFF of 8 or 16 bits, or as a table."
            raise refuse("image", None, "PNG, TIFF or CSV in grey", str(error), remedy) from None
        self.background = background_of(self.raw) if request.background is None else request.background
        self.signal = self.raw - self.background
        self.pixel_m = (request.pixel_um * 1e-6, (request.pixel_y_um or request.pixel_um) * 1e-6)
        try:
            self.moments: Moments = moments(self.signal, *self.pixel_m)
        except FlatImage as error:
            remedy = "Check background and exposure of the camera."
            raise refuse("image", None, "an image of a beam", str(error), remedy) from None
        self._found: dict[float, tuple[float, float, float]] = {}

    def worst(self, aperture_m: float) -> tuple[float, float, float]:
        """Largest fraction in an aperture [m] and where [m]."""
        if aperture_m not in self._found:
            self._found[aperture_m] = worst_fraction(
                self.signal, *self.pixel_m, aperture_m, self.moments.total
            )
        return self._found[aperture_m]

    def gaussian(self, aperture_m: float) -> float:
        """Fraction of a Gaussian of the same principal diameters in a centred aperture [m]."""
        x, y = (np.array([d / SQRT2]) for d in (self.moments.major_m, max(self.moments.minor_m, 1e-9)))
        return float(encircled_fraction(np.array([aperture_m]), x, y, np.array([False]))[0])


def picture(request: ProfileRequest) -> Picture:
    """The image of a request. Raises InvalidRequest where it cannot be used."""
    return Picture(request)


def profile(request: ProfileRequest, image: Picture | None = None) -> ProfileResult:
    """Judge an image. Raises InvalidRequest where it or its evaluation cannot be used."""
    image = image or picture(request)
    found = image.moments
    evaluation, line = _evaluated(request)
    targets: dict[str, PlaneTarget | None] = {"eye": None, "skin": None}
    apertures = set(request.apertures_mm)
    if evaluation is not None:
        for name in targets:
            target = _plane(evaluation, evaluation.target(name), line, request.distance_m, image)
            targets[name] = target
            apertures |= {round(c.aperture_mm, 9) for c in target.criteria}
    return ProfileResult(
        columns=image.raw.shape[1],
        rows=image.raw.shape[0],
        background=image.background,
        centre_mm=(found.x_m * 1e3, found.y_m * 1e3),
        diameter_mm=(found.width_x_m * 1e3, found.width_y_m * 1e3),
        principal_mm=(found.major_m * 1e3, found.minor_m * 1e3),
        azimuth_deg=float(np.degrees(found.azimuth_rad)),
        fractions=[_fraction(image, a) for a in sorted(apertures)],
        eye=targets["eye"],
        skin=targets["skin"],
        inputs=request.model_dump(mode="json", exclude_none=True, exclude={"image"}),
        image_digest=f"sha256:{hashlib.sha256(request.image.encode()).hexdigest()}",
        notices=_notices(request, image, evaluation),
        cautions=cautions(),
        service_version=__version__,
    )


def _evaluated(request: ProfileRequest) -> tuple[Evaluation | None, int]:
    if request.evaluation is None:
        return None, 0
    if request.line >= len(request.evaluation.lines):
        raise refuse(
            "line",
            request.line,
            f"0 to {len(request.evaluation.lines) - 1}",
            "the evaluation has no such line",
            "Count lines from 0.",
        )
    refuse_aid(request.evaluation)
    refuse_end(request.evaluation)
    rules = rule_set(request.evaluation.rules)
    lines, _ = lines_of([request.evaluation], rules)
    lines = behind_bench([request.evaluation], lines)
    with np.errstate(over="ignore", under="ignore"):
        return evaluate(lines, rules), request.line


def _fraction(image: Picture, aperture_mm: float) -> ApertureFraction:
    if not aperture_mm > 0.0:
        raise refuse(
            "apertures_mm", aperture_mm, "above 0 mm", "an aperture has a diameter", "Give it in millimetres."
        )
    fraction, x, y = image.worst(aperture_mm * 1e-3)
    gaussian = image.gaussian(aperture_mm * 1e-3)
    return ApertureFraction(
        aperture_mm=aperture_mm,
        fraction=fraction,
        at_mm=(x * 1e3, y * 1e3),
        gaussian_fraction=gaussian,
        ratio=fraction / gaussian,
    )


def _plane(
    evaluation: Evaluation, result: TargetResult, line: int, distance_m: float, image: Picture
) -> PlaneTarget:
    """Every criterion of the line with the fraction of the image instead of the beam's.

    The engine's strength of a criterion is its ratio if the whole beam passed the aperture; what hazy air
    has taken away up to the plane is missing from both.
    """
    criteria = result.criteria
    beams = evaluation.lines.beams.take(np.array([line]))
    left = float(np.exp(-beams.extinction_per_m[0] * distance_m))
    found = []
    for k in np.flatnonzero(criteria.line == line).tolist():
        aperture = float(criteria.aperture_m[k])
        strength = float(criteria.strength[k])
        entered = float(beams.fraction(np.array([aperture]), np.array([distance_m]))[0])
        fraction = image.worst(aperture)[0]
        row = evaluation.rules.rules.limits[criteria.row[k]]
        found.append(
            PlaneCriterion(
                rule=RULES[int(evaluation.exposures.rule[criteria.exposure[k]])],
                tissue=row.tissue,
                effect=row.effect,
                row=row.row,
                aperture_mm=aperture * 1e3,
                fraction=fraction,
                hazard_ratio=strength * fraction * left,
                entered_ratio=strength * entered,
            )
        )
    worst = max(c.hazard_ratio for c in found)
    return PlaneTarget(
        hazard_ratio=worst,
        optical_density=float(optical_density(np.array(worst))),
        entered_ratio=max(c.entered_ratio for c in found),
        exceeded=worst > 1.0,
        criteria=found,
    )


def _notices(request: ProfileRequest, image: Picture, evaluation: Evaluation | None) -> list[Notice]:
    notices: list[Notice] = []
    if evaluation is not None and request.evaluation is not None:
        notices += evaluation_notices(request.evaluation, evaluation.lines.exposure_s.tolist())

    def tell(code: str, field: str, text: str) -> None:
        notices.append(Notice(code=code, field=field, text=text))

    top = image.raw.max()
    if int((image.raw == top).sum()) >= SATURATED:
        tell(
            "saturated",
            "image",
            "Many pixels share the highest value: the camera may be saturated. A cut-off peak makes the beam "
            "look wider and the exposure smaller than it is. Take the image again with more attenuation.",
        )
    if image.moments.edge_share > EDGE:
        tell(
            "beam-at-the-edge",
            "image",
            "There is light at the edge of the image: the beam may not fit the camera, and diameters come "
            "out too small, or the background is wrong.",
        )
    across = min(image.moments.width_x_m / image.pixel_m[0], image.moments.width_y_m / image.pixel_m[1])
    if across < FEW_PIXELS:
        tell(
            "few-pixels", "pixel_um", f"The beam is only {across:.3g} pixels wide: its peak is smoothed away."
        )
    worse = [
        f
        for f in request.apertures_mm
        if f > 0.0 and image.worst(f * 1e-3)[0] > TOLD * image.gaussian(f * 1e-3)
    ]
    if worse:
        tell(
            "worse-than-gaussian",
            "image",
            "Inside "
            + ", ".join(f"{f:g} mm" for f in worse)
            + " lies more of the beam than a Gaussian of the same diameters would have: the Gaussian is too "
            "kind.",
        )
    if request.evaluation is not None and len(request.evaluation.lines) > 1:
        tell("one-line", "line", "Only the imaged line is judged in this plane; the other lines add to it.")
    return notices
