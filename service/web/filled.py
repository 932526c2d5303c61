"""The form of a request: the inverse of reading one, for links from a stored laser to its evaluation."""

from __future__ import annotations

from typing import Any

from service.contract.problem import Problem
from service.contract.request import EvaluationRequest
from service.web.fields import AID, BEAM, ELEMENTS, EMISSION, FIELDS, PARTS, TEXT, field_name
from service.web.form import Form, read_address
from service.web.numbers import plain

__all__ = ["form_of", "ranges_text"]

#: Fields of the form that hold the second axis, and the field of the request that holds both.
SECOND = {"diameter_y_mm": "diameter_mm", "divergence_y_mrad": "divergence_mrad"}


def form_of(request: EvaluationRequest) -> Form | None:
    """The form that stands for just this request; None where the form cannot hold all of it."""
    body = request.model_dump(mode="json", exclude_none=True)
    viewing = body["viewing"]
    values = _text({n: body.get(n) for n in (*TEXT, "exposure_s")})
    values |= _text({n: viewing.get(n) for n in ("distance_m", "visibility_km")})
    values |= _text({n: viewing.get("aid", {}).get(n.removeprefix("aid_")) for n in AID})
    if viewing.get("outdoors"):
        values["outdoors"] = "1"
    counts = {part: spec.least for part, spec in PARTS.items()}
    rows = {
        "lines": [_line(line) for line in body["lines"]],
        "elements": [_element(element) for element in body["bench"]],
        "pairs": [_pair(pair) for pair in body["eyewear"]],
        "windows": [_window(window) for window in body["windows"]],
    }
    for part, filled in rows.items():
        counts[part] = len(filled)
        for k, row in enumerate(filled, start=1):
            values |= {field_name(n, k): text for n, text in row.items()}
    form = Form(values, counts)
    try:
        read = read_address(form.query())
        same = read.request() == request
    except Problem:
        return None
    return read if same else None


def _text(values: dict[str, Any]) -> dict[str, str]:
    """Values as they are typed; what is blank is left out."""
    typed = {
        n: plain(v) if isinstance(v, int | float) and FIELDS[n].number else str(v)
        for n, v in values.items()
        if v is not None
    }
    return {n: text for n, text in typed.items() if text}


def _line(line: dict[str, Any]) -> dict[str, str]:
    emission, beam = line["emission"], line["beam"]
    own = {n: line.get(n) for n in ("wavelength_nm", "subtense_mrad", "output_mirror_reflectance")}
    own |= {n: emission.get(n) for n in EMISSION[emission["mode"]]}
    for name in BEAM[beam["profile"]]:
        given = beam.get(SECOND.get(name, name))
        axes = given if isinstance(given, list) else [given, None]
        own[name] = axes[name in SECOND]
    return _text({**own, "mode": emission["mode"], "profile": beam["profile"]})


def _element(element: dict[str, Any]) -> dict[str, str]:
    kind = element["element"]
    given = {n: element.get(n.removeprefix("bench_")) for n in ELEMENTS[kind][1]}
    if given.get("bench_rows") == 1:
        del given["bench_rows"]
    return {"bench_kind": kind, **_text(given)}


def _pair(pair: dict[str, Any]) -> dict[str, str]:
    light = pair.get("luminous_transmittance")
    ranges = {"pair_name": pair["name"], "pair_ranges": ranges_text(pair["ranges"])}
    return _text({**ranges, "pair_light_percent": None if light is None else 100.0 * light})


def _window(window: dict[str, Any]) -> dict[str, str]:
    names = {"window_name": "name", "window_distance_m": "distance_m", "window_density": "optical_density"}
    return _text({n: window.get(key) for n, key in names.items()})


def ranges_text(ranges: list[dict[str, Any]]) -> str:
    """Ranges of a pair as the form takes them: 780-1100: OD 7 | D LB6 + IR LB7; 532: OD 5."""
    parts = []
    for entry in ranges:
        low, high = entry["from_nm"], entry["to_nm"]
        density = entry.get("optical_density")
        offered = [] if density is None else [f"OD {plain(density)}"]
        offered += [entry["marking"]] if entry.get("marking") else []
        band = plain(low) if low == high else f"{plain(low)}-{plain(high)}"
        parts.append(f"{band}: {' | '.join(offered)}")
    return "; ".join(parts)
