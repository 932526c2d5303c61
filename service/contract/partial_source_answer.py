"""Structured sources to answers: parts by search, each judged by the one engine."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from service import __version__
from service.assess.evaluate import evaluate, optical_density
from service.assess.lines import Lines
from service.contract.answer import cautions, rule_set
from service.contract.beam_only import evaluation_notices, refuse_aid, refuse_bench
from service.contract.bounds_medium import refuse
from service.contract.convert import behind_bench, lines_of
from service.contract.partial_source import PartialSourceRequest, PartialSourceResult, SourcePart
from service.contract.picture import BadPicture, pixels_of
from service.contract.request import MAX_LABEL, EvaluationRequest
from service.contract.result import Notice
from service.optics.partial_source import Parts, drawn, frontier, parts
from service.optics.profile import background_of
from service.rules.compiled import CompiledRules

__all__ = ["partial_source", "source_image"]

Floats = NDArray[np.float64]

#: alpha_min and the largest alpha_max of every rule set [mrad].
ALPHA_MIN, ALPHA_MAX = 1.5, 100.0
#: Pixels across the smallest emitter, and most pixels along a side.
ACROSS, MOST = 24, 500
#: Images are joined to at most this many pixels along a side.
JOINED = 500
RETINA = "retina"


def source_image(request: PartialSourceRequest) -> tuple[Floats, tuple[float, float]]:
    """Power per pixel and angular size of a pixel [mrad]. Raises InvalidRequest where it cannot be used."""
    if request.image is None:
        return _emitters(request)
    try:
        raw = pixels_of(request.image, request.format)
    except BadPicture as error:
        remedy = "Save the camera's greyscale image as PNG or TIFF of 8 or 16 bits, or as a table."
        raise refuse("image", None, "PNG, TIFF or CSV in grey", str(error), remedy) from None
    background = background_of(raw) if request.background is None else request.background
    signal = np.maximum(raw - background, 0.0)
    if not signal.any():
        raise refuse("image", None, "an image of a source", "nothing stands out", "Check the background.")
    join = max(1, -(-max(signal.shape) // JOINED))
    if join > 1:
        rows, columns = (-(-n // join) for n in signal.shape)
        filled = np.zeros((rows * join, columns * join))
        filled[: signal.shape[0], : signal.shape[1]] = signal
        signal = filled.reshape(rows, join, columns, join).sum(axis=(1, 3))
    assert request.pixel_um is not None
    size = request.pixel_um * 1e-3 * join / request.distance_m
    return signal, (size, size)


def _emitters(request: PartialSourceRequest) -> tuple[Floats, tuple[float, float]]:
    """Emitters drawn as finely as their size asks and the extent allows; millimetres per metre are mrad."""
    distance = request.distance_m
    width = np.array([e.width_mm for e in request.emitters]) / distance
    height = np.array([e.height_mm or e.width_mm for e in request.emitters]) / distance
    x = np.array([e.x_mm for e in request.emitters]) / distance
    y = np.array([e.y_mm for e in request.emitters]) / distance
    extent = max(float((c + 0.5 * s).max() - (c - 0.5 * s).min()) for c, s in ((x, width), (y, height)))
    finest = min(float(np.minimum(width, height).min()), ALPHA_MIN) / ACROSS
    pixel = max(finest, extent / MOST)
    round_ = np.array([e.shape == "disc" for e in request.emitters])
    power = np.array([e.power for e in request.emitters])
    return drawn(x, y, width, height, round_, power, pixel), (pixel, pixel)


def partial_source(request: PartialSourceRequest) -> PartialSourceResult:
    """The worst part of a source. Raises InvalidRequest where source or evaluation cannot be used."""
    refuse_bench(request.evaluation)
    refuse_aid(request.evaluation)
    rules = rule_set(request.evaluation.rules)
    if request.line >= len(request.evaluation.lines):
        raise refuse(
            "line",
            request.line,
            f"0 to {len(request.evaluation.lines) - 1}",
            "the evaluation has no such line",
            "Count lines from 0.",
        )
    image, pixel = source_image(request)
    tried = frontier(parts(image, *pixel, ALPHA_MIN, ALPHA_MAX))
    single = request.evaluation.model_copy(update={"lines": [request.evaluation.lines[request.line]]})
    size = (image.shape[1] * pixel[0], image.shape[0] * pixel[1])
    whole_alpha = float(np.mean([max(side, ALPHA_MIN) for side in size]))
    # The parts, then the whole source as one, then all of it from one point.
    share = np.r_[tried.share, 1.0, 1.0]
    alpha = np.r_[tried.alpha_rad, whole_alpha, ALPHA_MIN]
    retina, distance, other, other_distance = _judged(single, rules, share, alpha)
    count = len(tried.share)
    worst = int(retina[:count].argmax())
    by_part = bool(retina[worst] >= other)
    ratio = float(max(retina[worst], other))
    reach = float(max(distance[worst], other_distance))
    listed = [_part(tried, k, float(retina[k])) for k in range(count)]
    whole = SourcePart(
        alpha_mrad=whole_alpha,
        width_mrad=size[0],
        height_mrad=size[1],
        at_mrad=(0.5 * size[0], 0.5 * size[1]),
        share=1.0,
        hazard_ratio=float(retina[count]),
    )
    return PartialSourceResult(
        worst=listed[worst],
        whole=whole,
        point_ratio=float(retina[count + 1]),
        parts=listed,
        eye_hazard_ratio=ratio,
        eye_optical_density=float(optical_density(np.array(ratio))),
        eye_hazard_distance_m=reach if np.isfinite(reach) else None,
        governing="part" if by_part else "other tissue",
        evaluation=_evaluation(single, listed[worst]),
        size_mrad=size,
        pixel_mrad=pixel,
        inputs=request.model_dump(mode="json", exclude_none=True, exclude={"image"}),
        notices=[
            *evaluation_notices(
                request.evaluation, lines_of([request.evaluation], rules)[0].exposure_s.tolist()
            ),
            *_notices(request, listed[worst], whole, pixel, size, retina[count:]),
        ],
        cautions=cautions(),
        service_version=__version__,
    )


def _judged(
    single: EvaluationRequest, rules: CompiledRules, share: Floats, alpha_mrad: Floats
) -> tuple[Floats, Floats, float, float]:
    """Ratio and distance of the retina for each share and subtense; of other tissues for the whole."""
    base = behind_bench([single], lines_of([single], rules)[0])
    take = np.zeros(len(share), dtype=np.intp)
    columns = {name: getattr(base, name)[take] for name in Lines.__slots__ if name not in ("laser", "beams")}
    lines = replace(
        Lines(laser=np.arange(len(share)), beams=base.beams.take(take), **columns),
        emitted=base.emitted[take] * share,
        subtense_mrad=alpha_mrad,
    )
    with np.errstate(over="ignore", under="ignore"):
        result = evaluate(lines, rules).eye
    is_retina = np.array([row.tissue == RETINA for row in rules.rules.limits])[result.criteria.row]
    line = result.criteria.line
    retina, distance = np.zeros(len(share)), np.zeros(len(share))
    np.maximum.at(retina, line[is_retina], result.hazard_ratio[is_retina])
    np.maximum.at(distance, line[is_retina], result.distance_m[is_retina])
    rest = ~is_retina & (line == len(share) - 1)
    other = float(result.hazard_ratio[rest].max(initial=0.0))
    return retina, distance, other, float(result.distance_m[rest].max(initial=0.0))


def _part(found: Parts, k: int, ratio: float) -> SourcePart:
    """One part; the search was in milliradians."""
    width, height = float(found.width_rad[k]), float(found.height_rad[k])
    return SourcePart(
        alpha_mrad=float(found.alpha_rad[k]),
        width_mrad=width,
        height_mrad=height,
        at_mrad=(float(found.x_rad[k]) + 0.5 * width, float(found.y_rad[k]) + 0.5 * height),
        share=float(found.share[k]),
        hazard_ratio=ratio,
    )


def _evaluation(single: EvaluationRequest, worst: SourcePart) -> dict[str, object]:
    """The worst part as an evaluation of its own."""
    body = single.model_dump(mode="json", exclude_unset=True)
    label = f"{single.label} (worst part of the source)" if single.label else "Worst part of the source"
    body["label"] = label[-MAX_LABEL:]
    line = body["lines"][0]
    for name in ("power_w", "energy_j", "average_power_w"):
        if line["emission"].get(name) is not None:
            line["emission"][name] *= worst.share
    line["subtense_mrad"] = worst.alpha_mrad
    return body


def _notices(
    request: PartialSourceRequest,
    worst: SourcePart,
    whole: SourcePart,
    pixel: tuple[float, float],
    size: tuple[float, float],
    known: Floats,
) -> list[Notice]:
    notices = []

    def tell(code: str, field: str | None, text: str) -> None:
        notices.append(Notice(code=code, field=field, text=text))

    if worst.hazard_ratio > whole.hazard_ratio * 1.001:
        tell(
            "part-is-worse",
            None,
            f"A part of the source is {worst.hazard_ratio / whole.hazard_ratio:.3g} times as hazardous for "
            "the retina as the whole source would be if it shone evenly: the part counts.",
        )
    if max(pixel) > ALPHA_MIN / 3.0:
        tell(
            "coarse-source",
            "pixel_um" if request.image is not None else "emitters",
            f"A pixel of the source is {max(pixel):.3g} mrad wide, not much less than 1.5 mrad: hot spots "
            "may be smoothed away. Use a finer image, or fewer emitters at once.",
        )
    if max(size) > ALPHA_MAX:
        tell(
            "wider-than-alpha-max",
            None,
            "The source is wider than 100 mrad: parts up to that size were tried, as no part of the retina "
            "gets warmer from light farther away.",
        )
    if known[1] == 0.0:
        tell(
            "no-retina",
            None,
            "At this wavelength the retina is not at risk: the form of the source does not matter.",
        )
    if len(request.evaluation.lines) > 1:
        tell("one-line", "line", "Only this line is judged; the other lines of the laser add to it.")
    return notices
